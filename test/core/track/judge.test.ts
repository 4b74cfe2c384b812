import { describe, expect, it } from 'vitest';
import {
  freshSensor,
  type Judgement,
  judgeSensor,
  releaseFromGroup,
  type SensorEvidence,
  type SensorMemory,
  shiftWithGroup,
} from '../../../src/core/track/judge.js';

const SCAN_S = 60;
const SIGMA = 1;

/** One thermocouple whose estimate stands at `predicted`; `scan` judges one reading a minute. */
function watched(defaults: Partial<SensorEvidence> = {}) {
  const memory: SensorMemory = freshSensor();
  let n = 0;
  let noise = 0;
  const scan = (value_K: number, over: Partial<SensorEvidence> = {}): Judgement => {
    n++;
    const evidence: SensorEvidence = {
      time_ms: n * SCAN_S * 1000,
      dt_s: SCAN_S,
      value_K,
      othersPresent: true,
      predicted_K: 500,
      sigma_K: SIGMA,
      rock_K: over.predicted_K ?? defaults.predicted_K ?? 500,
      // Nothing but the innovation is looked at, unless a test asks for more.
      rockSigma_K: Number.POSITIVE_INFINITY,
      placeSigma_K: 0,
      offsetSigma_K: 1,
      groupSigma_K: 0.5,
      deadband_K: 0,
      range_K: [200, 900],
      supported: false,
      movesAlike: false,
      guessed: false,
      flowing: false,
      topGas_K: Number.NaN,
      ...defaults,
      ...over,
    };
    const judgement = judgeSensor(memory, evidence);
    // As the tracker does after a scan; here the estimate is not corrected by the readings.
    memory.expected_K = evidence.predicted_K;
    return judgement;
  };
  /** A sound reading is never twice the same. */
  const sound = (over: Partial<SensorEvidence> = {}): Judgement => {
    noise = 0.2 - noise;
    return scan((over.predicted_K ?? 500) + noise, over);
  };
  return { memory, scan, sound, now_ms: () => n * SCAN_S * 1000 };
}

describe('a sound sensor', () => {
  it('is used and has no verdict', () => {
    const { memory, sound } = watched();
    for (let k = 0; k < 50; k++) expect(sound()).toBe('use');
    expect(memory.verdict).toBeNull();
  });

  it('is left out, not rejected, for up to four scans in a row outside the gate', () => {
    const { memory, scan, sound } = watched();
    for (let round = 0; round < 2; round++) {
      for (let k = 0; k < 4; k++) expect(scan(510 + 0.1 * k)).toBe('leave_out');
      expect(sound()).toBe('use');
    }
    expect(memory.verdict).toBeNull();
  });

  it('is softened, never rejected, where sensors beside it bear it out', () => {
    const { memory, scan } = watched({ supported: true });
    for (let k = 0; k < 30; k++) expect(scan(520 + (k % 2))).toBe('soften');
    expect(memory.verdict).toBeNull();
  });
});

describe('a reading that rock unseen beside it would explain', () => {
  const front = { unseen_K: [-3, 12], noiseSigma_K: 0.5 } as const;
  const GATE_K = 4.5 * SIGMA;
  const LEAP_K = 4.5 * Math.SQRT2 * front.noiseSigma_K;

  it('is softened for as long as it stays within, where it came step by step', () => {
    const { memory, scan, sound } = watched(front);
    sound();
    for (let off = 1; off < 12 + GATE_K; off++) {
      expect(scan(500 + off)).toBe(off > GATE_K ? 'soften' : 'use');
    }
    for (let k = 0; k < 30; k++) expect(scan(516 + 0.1 * (k % 2))).toBe('soften');
    expect(memory.verdict).toBeNull();
  });

  it('is named where it goes on beyond it, and on the side where no such rock is', () => {
    const up = watched(front);
    up.sound();
    for (let off = 1; off <= 16; off++) up.scan(500 + off);
    for (let k = 0; k < 5; k++) expect(up.scan(517 + k)).toBe('leave_out');
    expect(up.memory.verdict).not.toBeNull();
    const down = watched(front);
    down.sound();
    for (let off = 1; off <= 7; off++) down.scan(500 - off);
    expect(down.memory.outside).toBe(0);
    for (let off = 8; off <= 12; off++) down.scan(500 - off);
    expect(down.memory.verdict).not.toBeNull();
  });

  it('is named where it leapt there: fronts do not', () => {
    for (const side of [-1, 1]) {
      const { memory, scan, sound } = watched({ ...front, unseen_K: [-20, 20] });
      for (let k = 0; k < 9; k++) sound();
      for (let k = 0; k < 5; k++) expect(scan(500 + side * 8)).toBe('leave_out');
      expect(memory.verdict).toBe('offset');
    }
    const slow = watched({ ...front, unseen_K: [-20, 20] });
    slow.sound();
    const step_K = 0.9 * LEAP_K;
    for (let off = step_K; off < 20; off += step_K) {
      expect(slow.scan(500 + off)).toBe(off > GATE_K ? 'soften' : 'use');
    }
  });

  it('is named where reading and deviation leapt; not where one of them did alone', () => {
    const wide = { ...front, unseen_K: [-20, 20] } as const;
    // The flow stops: the prediction jumps, the junction reads on as before.
    const estimate = watched(wide);
    estimate.sound();
    for (let k = 0; k < 9; k++) {
      expect(estimate.scan(500 + 0.1 * (k % 2), { predicted_K: 510 })).toBe('soften');
    }
    expect(estimate.memory.verdict).toBeNull();
    // Both jump, and it is the reading that went where the estimate did not.
    const sensor = watched(wide);
    sensor.sound();
    for (let k = 0; k < 5; k++) {
      expect(sensor.scan(508 + 0.1 * (k % 2), { predicted_K: 497 })).toBe('leave_out');
    }
    expect(sensor.memory.verdict).toBe('offset');
  });

  it('is followed while the junction settles after a change of the flow, unless it leaps', () => {
    const wide = { ...front, unseen_K: [-20, 20] } as const;
    for (const [leap_K, last] of [
      [0, 'soften'],
      [2 * LEAP_K, 'leave_out'],
    ] as const) {
      const { memory, scan, sound, now_ms } = watched(wide);
      sound();
      memory.unsettled_ms = now_ms() + 10 * SCAN_S * 1000;
      let read_K = 500;
      for (let k = 1; k < 10; k++) {
        read_K += k === 5 ? leap_K : 0.4 * LEAP_K;
        expect(scan(read_K)).toBe('leave_out');
      }
      expect(read_K - 500).toBeGreaterThan(2 * LEAP_K);
      expect(scan(read_K + 0.1)).toBe(last);
    }
  });

  it('is left out once it was found outside, until it is back inside the gate', () => {
    const { scan, sound } = watched({ ...front, unseen_K: [-20, 20] });
    sound();
    expect(scan(508)).toBe('leave_out');
    expect(scan(508.1)).toBe('leave_out');
    expect(sound()).toBe('use');
  });
});

describe('open', () => {
  it('is a reading that is missing while others of the store deliver', () => {
    const { memory, scan, sound, now_ms } = watched();
    sound();
    expect(scan(Number.NaN)).toBe('leave_out');
    expect(memory.verdict).toBe('open');
    expect(memory.since_ms).toBe(now_ms());
    expect(memory.evidence).not.toBe('');
  });

  it('ends with the next reading, which is used', () => {
    const { memory, scan, sound } = watched();
    for (let k = 0; k < 5; k++) scan(Number.NaN);
    expect(sound()).toBe('use');
    expect(memory.verdict).toBeNull();
  });

  it('is no verdict where the whole store is silent', () => {
    const { memory, scan } = watched({ othersPresent: false });
    for (let k = 0; k < 5; k++) expect(scan(Number.NaN)).toBe('leave_out');
    expect(memory.verdict).toBeNull();
  });

  it('takes an infinite reading for a missing one', () => {
    const { memory, scan } = watched();
    scan(Number.POSITIVE_INFINITY);
    expect(memory.verdict).toBe('open');
  });

  it('does not hide an earlier verdict', () => {
    const { memory, scan } = watched();
    scan(1000);
    scan(Number.NaN);
    expect(memory.verdict).toBe('burst');
  });
});

describe('burst', () => {
  it.each([
    [950, 'up'],
    [150, 'down'],
    [1e300, 'far up'],
    [-9725.85, 'to a code'],
  ])('is a reading beyond what the plant can produce: %d K (%s)', (value) => {
    const { memory, scan, sound } = watched();
    sound();
    expect(scan(value)).toBe('leave_out');
    expect(memory.verdict).toBe('burst');
  });

  it('is believed again after twenty sound scans in a row, and not before', () => {
    const { memory, scan, sound } = watched();
    scan(950);
    for (let k = 0; k < 19; k++) expect(sound()).toBe('leave_out');
    scan(950);
    for (let k = 0; k < 19; k++) expect(sound()).toBe('leave_out');
    expect(memory.verdict).toBe('burst');
    sound();
    expect(memory.verdict).toBeNull();
    expect(sound()).toBe('use');
  });
});

describe('offset and drifting', () => {
  it('is an offset after five scans in a row outside the gate at about the same distance', () => {
    const { memory, scan } = watched();
    for (let k = 0; k < 4; k++) {
      scan(508 + 0.1 * (k % 2));
      expect(memory.verdict).toBeNull();
    }
    scan(508);
    expect(memory.verdict).toBe('offset');
  });

  it('is drifting where the distance has grown by a third or more since the first of them', () => {
    const { memory, scan } = watched();
    for (let k = 0; k < 5; k++) scan(505 + 0.5 * k);
    expect(memory.verdict).toBe('drifting');
  });

  it('is an offset where it leapt, though a front that passes makes it grow by half', () => {
    const { memory, scan, sound } = watched();
    for (let k = 0; k < 10; k++) sound();
    for (let k = 0; k < 5; k++) scan(508 + k);
    expect(memory.verdict).toBe('offset');
  });

  it.each([2, 8, -8])('is drifting where it goes on as it came, by %d K a scan', (rate) => {
    const { memory, scan, sound } = watched();
    for (let k = 0; k < 10; k++) sound();
    for (let k = 1; memory.verdict === null; k++) scan(500 + rate * k);
    expect(memory.verdict).toBe('drifting');
  });

  it('counts to either side', () => {
    const { memory, scan } = watched();
    for (let k = 0; k < 5; k++) scan(492 - 0.01 * (k % 2));
    expect(memory.verdict).toBe('offset');
  });

  it('is believed again after twenty scans in a row within three sigma', () => {
    const { memory, scan, sound } = watched();
    for (let k = 0; k < 5; k++) scan(508 + 0.1 * (k % 2));
    for (let k = 0; k < 19; k++) sound();
    // Within the gate, yet not within three sigma: the row is broken.
    scan(504);
    for (let k = 0; k < 19; k++) expect(sound()).toBe('leave_out');
    expect(memory.verdict).toBe('offset');
    sound();
    expect(memory.verdict).toBeNull();
  });
});

describe('a slow drift that was named at less than 5 K', () => {
  // As the filter has it after judgeUndo: 1 K of the own offset's prior is in the innovation.
  const told = { sigma_K: Math.hypot(0.3, 0.4, 1), noiseSigma_K: 0.4, rockSigma_K: 0.3 };

  it.each([0, -1.5, 1.5])(
    'stays out while it lasts and is used again when mended, off by %d K',
    (own) => {
      const { memory, sound } = watched(told);
      // The own offset is learned into the prediction; the rock is told without it.
      const reads = (error: number, scans: number) => {
        for (let k = 0; k < scans; k++) {
          const predicted_K = memory.verdict === null ? 500 + own : 500;
          sound({ value_K: 500 + own + error + 0.2 * (k % 2), predicted_K, rock_K: 500 });
        }
      };
      reads(0, 300);
      for (let k = 1; k <= 180; k++) reads((4.5 * k) / 180, 1);
      expect(memory.verdict).toBe('drifting');
      expect(memory.off_K).toBeLessThan(4.5);
      reads(4.5, 600);
      expect(memory.verdict).toBe('drifting');
      reads(0, 19);
      expect(memory.verdict).toBe('drifting');
      reads(0, 1);
      expect(memory.verdict).toBeNull();
    },
  );

  it('ends where it was named against a profile that was bent, as no class allows, and is learned anew', () => {
    const { memory, sound } = watched(told);
    // The bent profile has it 6 K low; then the front passes and it is right.
    const reads = (d: number, scans: number) => {
      for (let k = 0; k < scans; k++) {
        const value_K = 500 + 0.2 * (k % 2);
        sound({ value_K, predicted_K: 500, rock_K: 500 - d });
      }
    };
    reads(-6, 90);
    for (let k = 0; memory.verdict === null && k < 100; k++) reads(0, 1);
    expect(memory.verdict).toBe('drifting');
    reads(0, 20);
    expect(memory.verdict).toBeNull();
    reads(0, 300);
    expect(memory.verdict).toBeNull();
  });

  it('stays out while the rock there is not told well enough to show it', () => {
    const { memory, sound } = watched(told);
    let n = 0;
    const reads = (error: number, over: Partial<SensorEvidence> = {}) =>
      sound({ value_K: 500 + error + 0.2 * (n++ % 2), ...over });
    for (let k = 0; k < 300; k++) reads(0);
    for (let k = 1; k <= 180; k++) reads((4.5 * k) / 180);
    const blind = { sigma_K: 3, rockSigma_K: 2.5 };
    for (let k = 0; k < 100; k++) reads(0, blind);
    expect(memory.verdict).toBe('drifting');
  });
});

describe('stuck', () => {
  /** The rock beside the sensor moves by `rate` K per scan while its reading stays. */
  function frozen(rate: number, scans: number, over: Partial<SensorEvidence> = {}) {
    const sensor = watched(over);
    sensor.sound();
    const judgements: Judgement[] = [];
    for (let k = 1; k <= scans; k++) {
      judgements.push(sensor.scan(500, { predicted_K: 500 + rate * k }));
    }
    return { ...sensor, judgements };
  }

  it('is a reading unchanged for ten minutes while the rock there moved far', () => {
    const { memory } = frozen(0.6, 12);
    // 12 min and 7.2 K: more than 4 K and six sigma.
    expect(memory.verdict).toBe('stuck');
  });

  it('is not a matter of minutes: a fast front does not make it stuck before ten', () => {
    expect(frozen(4, 9).memory.verdict).not.toBe('stuck');
  });

  it('is left out before the verdict, once the rock should have moved visibly', () => {
    const { judgements, memory } = frozen(0.25, 10);
    expect(judgements[0]).toBe('use');
    expect(judgements.at(-1)).toBe('leave_out');
    expect(memory.verdict).toBeNull();
  });

  it('is not a value that is rightly steady, however long', () => {
    const { memory, judgements } = frozen(0, 5000);
    expect(memory.verdict).toBeNull();
    expect(judgements.every((j) => j === 'use')).toBe(true);
  });

  it('is not a value that stays within its reporting deadband', () => {
    const { memory, scan } = watched({ deadband_K: 3 });
    // The rock moves by 5 K in 20 min, less than twice the deadband.
    for (let k = 0; k < 20; k++) scan(500, { predicted_K: 500 + 0.25 * k });
    expect(memory.verdict).toBeNull();
  });

  it('is not a value that follows the rock by steps of the deadband', () => {
    const { memory, scan } = watched({ deadband_K: 2 });
    for (let k = 0; k < 200; k++) {
      const rock = 500 + 0.3 * k;
      expect(scan(500 + 2.5 * Math.floor((rock - 500) / 2.5), { predicted_K: rock })).toBe('use');
    }
    expect(memory.verdict).toBeNull();
  });

  it('is not returned while the rock passes the frozen value', () => {
    const { memory, scan } = frozen(0.6, 12);
    for (let k = 0; k < 100; k++) scan(500, { predicted_K: 507.2 - 0.144 * k });
    expect(memory.verdict).toBe('stuck');
    for (let k = 0; k < 100; k++) scan(500, { predicted_K: 500 });
    expect(memory.verdict).toBe('stuck');
  });

  it('is believed again once it has moved five times and been sound for twenty scans', () => {
    const { memory, sound } = frozen(0.6, 12);
    let scans = 0;
    while (memory.verdict !== null && scans < 100) {
      sound();
      scans++;
    }
    expect(scans).toBe(20);
  });
});

describe('group_fault', () => {
  it('marks a sensor that is used on, and leaves a verdict of its own alone', () => {
    const { memory, sound } = watched();
    shiftWithGroup(memory, 1000, 'the whole card moved', 5);
    expect(memory).toMatchObject({ verdict: 'group_fault', since_ms: 1000, shift_K: 5 });
    // The caller takes the step off the reading.
    expect(sound()).toBe('use');
    expect(memory.verdict).toBe('group_fault');
    const other = watched();
    other.scan(950);
    shiftWithGroup(other.memory, 1000, 'the whole card moved', 5);
    expect(other.memory).toMatchObject({ verdict: 'burst', shift_K: 5 });
  });

  it('gives way to what the sensor shows itself', () => {
    const { memory, scan } = watched();
    shiftWithGroup(memory, 0, 'the whole card moved', 5);
    for (let k = 0; k < 5; k++) scan(520);
    expect(memory.verdict).toBe('offset');
  });

  it.each([
    ['a missing reading', [Number.NaN]],
    ['a burst', [950, ...Array.from({ length: 20 }, (_, k) => 500 + 0.2 * (k % 2))]],
  ])('shows again, since when and why, after %s of its own', (_, values) => {
    const { memory, scan, sound } = watched();
    sound();
    shiftWithGroup(memory, 60_000, 'the whole card moved', 8);
    sound();
    for (const value of values) scan(value);
    expect(sound()).toBe('use');
    expect(memory).toMatchObject({
      verdict: 'group_fault',
      since_ms: 60_000,
      evidence: 'the whole card moved',
      shift_K: 8,
    });
    scan(Number.NaN);
    releaseFromGroup(memory);
    sound();
    expect(memory).toMatchObject({ verdict: null, evidence: '', shift_K: 0 });
  });

  it('ends with the step of its group', () => {
    const { memory } = watched();
    shiftWithGroup(memory, 0, 'the whole card moved', 5);
    releaseFromGroup(memory);
    expect(memory).toMatchObject({ verdict: null, shift_K: 0 });
  });
});

describe('what is remembered of a sensor', () => {
  it('stays plain and of the same size, however long it is judged', () => {
    const { memory, scan, sound } = watched();
    const keys = Object.keys(memory).sort();
    for (let k = 0; k < 300; k++) {
      if (k % 7 === 0) scan(k % 2 ? Number.NaN : 950);
      else sound();
    }
    expect(Object.keys(memory).sort()).toEqual(keys);
    for (const value of Object.values(memory)) {
      if (value !== null) expect(['number', 'string']).toContain(typeof value);
    }
  });
});
