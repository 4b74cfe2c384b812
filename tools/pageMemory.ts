/**
 * Whether the page grows in memory while it follows a plant: a demonstration of its own at its usual
 * speed, real Chromium, a sheet after the other, each for so many hours of plant time of live
 * updates. After a warm-up the heap in use after collecting garbage, the DOM nodes and the listeners
 * are taken every tenth of the time; a line through them tells the growth per hour of plant time.
 * The script is not compiled to machine code: of what hot functions become, more is made for a long
 * time, and it counts as heap. What is left are the objects of the page.
 * A sheet holds where that line, over all the hours, rises by less than 5 % of what was there, or by
 * less than twice its own standard error. Ends with 1 where one does not.
 *
 *   npx tsx tools/pageMemory.ts --sheets now:8,rock/playback:2
 *
 * Options: --sheets PATH:HOURS,... (now:8,rock/indicators:2,rock/playback:2,offer/table:2), --speed 300, --warm 2 (hours
 * of plant time before the first sheet, 0.5 before each further), --url ADDRESS of a page that runs
 *. It shows the page that npm run build made.
 */
import { spawn } from 'node:child_process';
import { fileURLToPath } from 'node:url';
import { parseArgs } from 'node:util';
import type { CDPSession, Page } from 'playwright-core';
import { openBrowser } from '../test/adapters/page/browser.js';
import { findProgram, PROGRAMS } from '../test/support/requirements.js';
import { helpIfAsked } from './help.js';
import { goTo } from './page/places.js';
import { slope } from './page/slope.js';

helpIfAsked(import.meta.url);

const { values } = parseArgs({
  options: {
    sheets: { type: 'string', default: 'now:8,rock/indicators:2,rock/playback:2,offer/table:2' },
    speed: { type: 'string', default: '300' },
    warm: { type: 'string', default: '2' },
    url: { type: 'string' },
  },
});
const SAMPLES = 10;
const WARM_FURTHER_H = 0.5;
const SHARE = 0.05;
const NOT_COMPILED = '--js-flags=--no-sparkplug --no-maglev --no-opt --no-flush-bytecode';
/** A machine that is busy with the plant answers late [ms]. */
const PATIENT_MS = 180_000;

interface Sample {
  readonly hour: number;
  readonly heap_kB: number;
  readonly nodes: number;
  readonly listeners: number;
}

async function startDemo(): Promise<{ url: string; stop(): void }> {
  const root = fileURLToPath(new URL('..', import.meta.url));
  const args = ['--import', 'tsx', 'src/main.ts', 'demo', '--speed', values.speed];
  const ports = ['--http-port', '0', '--mqtt-port', '0', '--log-level', 'silent'];
  const child = spawn(process.execPath, [...args, ...ports], {
    cwd: root,
    stdio: ['ignore', 'pipe', 'inherit'],
  });
  let said = '';
  const url = await new Promise<string>((resolve, reject) => {
    child.once('exit', (code) => reject(new Error(`the demonstration ended with ${code}`)));
    child.stdout.on('data', (chunk: Buffer) => {
      said += chunk.toString();
      const found = / page=(\S+)/.exec(said)?.[1];
      if (found !== undefined) resolve(found);
    });
  });
  return { url, stop: () => child.kill('SIGTERM') };
}

/** Source time of the newest estimate [h since 1970]; the plant is slower than asked on a slow machine. */
async function plantHour(url: string): Promise<number> {
  const answer = await fetch(`${url}api/units`);
  const { units } = (await answer.json()) as { units: { time: string | null }[] };
  const time = units[0]?.time ?? null;
  return time === null ? Number.NaN : Date.parse(time) / 3.6e6;
}

async function sample(page: Page, session: CDPSession, hour: number): Promise<Sample> {
  // The browser's own notes of what was loaded, up to 250.
  await page.evaluate(() => performance.clearResourceTimings());
  // What a first collection finalises, a second one takes.
  for (let n = 0; n < 2; n++) await session.send('HeapProfiler.collectGarbage');
  const { metrics } = await session.send('Performance.getMetrics');
  const of = (name: string) => metrics.find((one) => one.name === name)?.value ?? Number.NaN;
  return {
    hour,
    heap_kB: of('JSHeapUsedSize') / 1000,
    nodes: of('Nodes'),
    listeners: of('JSEventListeners'),
  };
}

async function untilHour(url: string, hour: number): Promise<number> {
  for (let failed = 0; ; ) {
    try {
      const now = await plantHour(url);
      if (now >= hour) return now;
      failed = 0;
    } catch (thrown) {
      // A server may end a connection that is kept alive just as it is used again.
      failed += 1;
      if (failed > 5) throw thrown;
    }
    await new Promise((resolve) => setTimeout(resolve, 200));
  }
}

/** What of a figure is told, and whether it holds. */
function judged(what: string, unit: string, samples: readonly Sample[], y: number[]): boolean {
  const x = samples.map(({ hour }) => hour);
  const { slope: rise, se } = slope(x, y);
  const span = x.at(-1)! - x[0]!;
  const holds = rise * span < Math.max(SHARE * y[0]!, 2 * se * span);
  const figures = `${y[0]!.toFixed(0)} -> ${y.at(-1)!.toFixed(0)} ${unit}`;
  const slopes = `${rise.toFixed(1)} ± ${se.toFixed(1)} ${unit} an hour of plant time`;
  console.log(`  ${what.padEnd(10)} ${figures.padEnd(24)} ${slopes}${holds ? '' : ', GROWS'}`);
  return holds;
}

async function follow(page: Page, url: string, path: string, hours: number, warm_h: number) {
  const session = await page.context().newCDPSession(page);
  await session.send('Performance.enable');
  await goTo(page, path);
  const begun = await untilHour(url, (await plantHour(url)) + warm_h);
  const samples: Sample[] = [];
  for (let n = 0; n <= SAMPLES; n++) {
    const hour = await untilHour(url, begun + (n * hours) / SAMPLES);
    samples.push(await sample(page, session, hour - begun));
  }
  await session.detach();
  console.log(
    `${path}: ${samples.at(-1)!.hour.toFixed(1)} h of plant time, ${samples.length} times`,
  );
  const of = (name: 'heap_kB' | 'nodes' | 'listeners') => samples.map((one) => one[name]);
  return [
    judged('heap', 'kB', samples, of('heap_kB')),
    judged('nodes', '', samples, of('nodes')),
    judged('listeners', '', samples, of('listeners')),
  ].every(Boolean);
}

const program = findProgram(PROGRAMS.chromium.names);
if (program === null) {
  process.stderr.write(`This needs Chromium: install the package ${PROGRAMS.chromium.package}.\n`);
  process.exit(2);
}
const sheets = values.sheets.split(',').map((text) => {
  const [path = '', hours] = text.split(':');
  if (!(Number(hours) > 0)) {
    process.stderr.write(`--sheets is PATH:HOURS,..., got "${text}"\n`);
    process.exit(2);
  }
  return { path, hours: Number(hours) };
});
const demo = values.url === undefined ? await startDemo() : null;
const url = values.url ?? demo!.url;
const browser = await openBrowser(program, [NOT_COMPILED]);
let holds = true;
try {
  const page = await browser.newPage({ viewport: { width: 1280, height: 800 } });
  page.setDefaultTimeout(PATIENT_MS);
  page.on('console', (said) => process.stderr.write(`console: ${said.text()}\n`));
  await page.goto(url);
  await page.waitForSelector('#freshness[data-trust^="live"], #freshness[data-trust="degraded"]');
  for (const [i, { path, hours }] of sheets.entries()) {
    const warm_h = i === 0 ? Number(values.warm) : WARM_FURTHER_H;
    holds = (await follow(page, url, path, hours, warm_h)) && holds;
  }
} finally {
  await browser.close();
  demo?.stop();
}
console.log(holds ? 'Nothing grows.' : 'Something grows.');
process.exit(holds ? 0 : 1);
