import { describe, expect, it } from 'vitest';
import { SCENARIOS } from '../../tools/chaos/scenarios.js';
import { temporaryFolder } from '../support/folders.js';
import { requireProgram } from '../support/requirements.js';

const mosquitto = requireProgram('mosquitto');
const influxd = requireProgram('influxd');
/** The cheap ones, in few rounds: `npm run chaos` does all of them, in many. */
const SHORT = SCENARIOS.filter(({ name }) => ['broker', 'error', 'disk'].includes(name));

describe.skipIf(!mosquitto || !influxd)('a few rounds of chaos', () => {
  it.each(SHORT)(
    'lose nothing and double nothing: $name',
    async ({ run }) => {
      const ledger = await run({
        programs: { mosquitto: mosquitto!, influxd: influxd! },
        ...{ folder: temporaryFolder('chaos'), rounds: 1, seed: 3 },
      });
      expect(ledger).toMatchObject({ lost: 0, doubled: 0, journaled: ledger.in });
      expect(ledger.committed + ledger.told).toBe(ledger.scans);
      expect(ledger.in).toBeGreaterThan(0);
    },
    240_000,
  );
});
