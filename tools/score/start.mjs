import '../node-version.mjs';

const { setUp } = await import('../setup.mjs');
const { runPlain } = await import('../programs.mjs');

await setUp({ build: false });
process.exit(await runPlain('tools/score.ts', process.argv.slice(2)));
