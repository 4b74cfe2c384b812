import '../node-version.mjs';

const { setUp } = await import('../setup.mjs');
const { runPackage } = await import('../programs.mjs');

await setUp({ build: false });
process.exit(await runPackage('tsx/dist/cli.mjs', ['tools/score.ts', ...process.argv.slice(2)]));
