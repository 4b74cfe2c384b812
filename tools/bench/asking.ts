import { loadSite } from '../../src/config/load.js';
import { demoSite, runDemo } from '../../src/daemon.js';
import { createLog } from '../../src/log.js';
import { latenessWhileAsked } from '../../test/support/loopLateness.js';

const CLIENTS = 20;
const SECONDS = 60;
/** Scans of 30 s, one a second. */
const SPEED = 30;

/**
 * How late the main loop of a daemon with the demonstration plant comes to a timer while 20 clients
 * ask for hours, headroom, offers, schedules and capability. It begins at the tenth scan.
 */
export async function benchAsking(
  configPath: string,
  line: (what: string, value: string) => void,
): Promise<void> {
  const { site, remove } = await demoSite(loadSite(configPath), {
    ...{ http_port: 0, mqtt_port: 0, keep: false },
  });
  const log = createLog({ level: 'silent' });
  const options = { log, version: '0', configPath, speed: SPEED, seed: 1, incidents: false };
  const demo = await runDemo(site, options);
  try {
    const { service } = demo.daemon;
    while ((service.counters().scans ?? 0) < 10) {
      await new Promise((resolve) => setTimeout(resolve, 100));
    }
    const found = await latenessWhileAsked(demo, CLIENTS, SECONDS);
    const all = found.asked.flat();
    const answered = all.filter((one) => one.status === 200);
    const ms = (value: number): string => `${value.toFixed(0)} ms`;
    line(
      `the loop is late while ${CLIENTS} clients ask, p50, p99, most`,
      `${ms(found.p50_ms)}, ${ms(found.p99_ms)}, ${ms(found.most_ms)} (p99 to stay under 100 ms)`,
    );
    const slowest = Math.max(...answered.map((one) => one.took_ms)) / 1000;
    line(
      `  answers and refusals in ${SECONDS} s`,
      `${answered.length} and ${all.length - answered.length}, the slowest after ${slowest.toFixed(1)} s`,
    );
  } finally {
    await demo.stop();
    remove();
  }
}
