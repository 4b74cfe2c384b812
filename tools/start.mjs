import './node-version.mjs';

const { setUp } = await import('./setup.mjs');
await setUp({ build: true });
// In this very process, so that an interrupt at the terminal reaches the daemon itself.
process.argv.splice(1, 1, 'rockhour', 'demo');
await import('../dist/main.js');
