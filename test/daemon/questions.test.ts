import { readFileSync, writeFileSync } from 'node:fs';
import { join } from 'node:path';
import { afterEach, describe, expect, it } from 'vitest';
import { loadSite, readSource } from '../../src/config/load.js';
import { saveUnit, startUnit } from '../../src/core/unit.js';
import { type Core, realCore } from '../../src/daemon/core.js';
import { Questions } from '../../src/daemon/questions.js';
import { temporaryFolder } from '../support/folders.js';
import { fakeCore } from './fakeCore.js';

// Few cells: what is tested is who answers and when, not the figures.
const config = join(temporaryFolder('questions'), 'plant.yaml');
const demo = readFileSync('config/demo.yaml', 'utf8');
writeFileSync(
  config,
  demo.replace('hours_at_MW_el: [1.8, 1.2]', 'hours_at_MW_el: [1.8]\n    estimator: { cells: 20 }'),
);
const unit = loadSite(config).units[0]!;
const open: Questions[] = [];

function questions(core: Core, configPath: string | null): Questions {
  const made = new Questions(core, configPath === null ? null : readSource(configPath));
  open.push(made);
  return made;
}

afterEach(async () => {
  await Promise.all(open.splice(0).map((one) => one.stop()));
});

describe('questions to worker threads', () => {
  it('answer hours while thermocouples are still being weighed, and weigh a day once', async () => {
    const asked = questions(realCore, config);
    const order: string[] = [];
    const day = asked.sensors(unit, null).then((worth) => {
      order.push('day');
      return worth;
    });
    const again = asked.sensors(unit, null);
    const hours = await asked.hours(unit, saveUnit(startUnit(unit)), [1.8e6]);
    order.push('hours');
    expect(hours).toMatchObject([{ power_MW: 1.8, hours: { p90: 0 } }]);
    const worth = await day;
    expect(order).toEqual(['hours', 'day']);
    expect(await again).toBe(worth);
    expect(await asked.sensors(unit, null)).toBe(worth);
    expect(worth!.stores.map((store) => store.sensors.length)).toEqual([42, 42]);
    // Nothing has been read yet: there is no state to look ahead from.
    expect(await asked.sensors(unit, saveUnit(startUnit(unit)))).toBeNull();
  });

  it('are answered by the configuration that the daemon runs by, whatever the file says by now', async () => {
    const changing = join(temporaryFolder('questions'), 'plant.yaml');
    writeFileSync(changing, readFileSync(config, 'utf8'));
    const asked = questions(realCore, changing);
    writeFileSync(changing, 'units: being edited');
    const hours = await asked.hours(unit, saveUnit(startUnit(unit)), [1.8e6]);
    expect(hours).toMatchObject([{ power_MW: 1.8, hours: { p90: 0 } }]);
  });

  it('say what went wrong, and are answered again afterwards', async () => {
    const asked = questions(realCore, config);
    const other = { ...unit, id: 'elsewhere' };
    await expect(asked.sensors(other, null)).rejects.toThrow(/elsewhere/);
    await expect(asked.sensors(other, null)).rejects.toThrow(/elsewhere/);
    const stopped = asked.sensors(unit, null);
    await asked.stop();
    await expect(stopped).rejects.toThrow(/stopping/);
  });
});

describe('questions without a configuration file', () => {
  const snapshot = fakeCore.saveUnit(fakeCore.startUnit(unit));

  it('are answered in this thread, anew for each state', async () => {
    let weighed = 0;
    const counting: Core = {
      ...fakeCore,
      unitWorth: (of, state) => {
        weighed++;
        return fakeCore.unitWorth(of, state);
      },
    };
    const asked = questions(counting, null);
    const both = await Promise.all([asked.sensors(unit, snapshot), asked.sensors(unit, snapshot)]);
    expect(both[0]).toMatchObject({ unit: unit.id, over: { kind: 'now', hours: 0.5 } });
    expect(both[1]).toBe(both[0]);
    await asked.sensors(unit, snapshot);
    expect(weighed).toBe(2);
  });

  it('leave room for other work between slices', async () => {
    const endless: Core = {
      ...fakeCore,
      *unitWorth(of, state) {
        const begun_ms = performance.now();
        while (performance.now() - begun_ms < 200) yield 0.5;
        return yield* fakeCore.unitWorth(of, state);
      },
    };
    const asked = questions(endless, null);
    let turns = 0;
    const clock = setInterval(() => turns++, 5);
    await asked.sensors(unit, null);
    clearInterval(clock);
    // Slices of 25 ms in 200 ms, on a machine that may be busy.
    expect(turns).toBeGreaterThan(2);
  });
});
