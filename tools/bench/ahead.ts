import { RecordingReader } from '../../src/adapters/recording/reader.js';
import type { UnitDefinition } from '../../src/core/definitions.js';
import { answerPlan, type PlanQuestion } from '../../src/core/plan/ask.js';
import { nextOnGrid } from '../../src/core/plan/offerAsk.js';
import { advance, startUnit, type UnitState } from '../../src/core/unit.js';

/** Scans of the recording's first charge, after which the stores are nearly full. */
const SCANS = 400;
const HOUR_MS = 3_600_000;
const RUNS = 5;

/** A question to be timed: what it is, what it is to take at most, and the question itself. */
interface Timed {
  readonly what: string;
  readonly most_s: number;
  readonly question: PlanQuestion;
}

/**
 * What questions about what lies ahead cost on one core: the median of some runs after one that warms
 * up, in processor time of this process, so that others on the machine count less.
 */
export async function benchAhead(
  unit: UnitDefinition,
  file: string,
  line: (what: string, value: string) => void,
): Promise<void> {
  const state = await fullState(unit, file);
  for (const { what, most_s, question } of questions(unit, state.time_ms as number)) {
    answerPlan(unit, state, question);
    const times = Array.from({ length: RUNS }, () => {
      const from = process.cpuUsage();
      answerPlan(unit, state, question);
      const { user, system } = process.cpuUsage(from);
      return (user + system) / 1e6;
    }).sort((a, b) => a - b);
    line(what, `${(times[RUNS >> 1] as number).toFixed(2)} s (to stay under ${most_s} s)`);
  }
}

/** Further questions take their line here. */
function questions(unit: UnitDefinition, now_ms: number): Timed[] {
  const first_ms = nextOnGrid(unit, now_ms + HOUR_MS, 900);
  const offers: PlanQuestion = {
    kind: 'offers',
    ask: {
      powers_W: [0.4, 0.52, 0.64, 0.76, 0.88, 1].map((share) => share * unit.rated_power_W),
      starts_ms: [0, 4, 8, 12].map((hours) => first_ms + hours * HOUR_MS),
      block_s: 900,
      certainties: [0.5, 0.75, 0.9, 0.95],
    },
  };
  return [
    { what: 'offers, 6 powers x 4 starts', most_s: 3, question: offers },
    { what: 'schedule, 96 blocks, it holds', most_s: 2, question: day(unit, first_ms, 0.6) },
    { what: 'schedule, 96 blocks, nearest sought', most_s: 2, question: day(unit, first_ms, 1) },
  ];
}

/** A day in quarter-hours: discharges in the morning and the evening, a charge between. */
function day(unit: UnitDefinition, first_ms: number, share: number): PlanQuestion {
  const blocks = Array.from({ length: 96 }, (_, i) => {
    const hour = i / 4;
    const runs = hour < 1 ? 'stand' : hour < 7 ? 'discharge' : hour < 9 ? 'stand' : 'charge';
    const mode = hour < 14 ? runs : hour < 17 ? 'stand' : hour < 23 ? 'discharge' : 'stand';
    // From quarter to quarter another power, as a market clears it.
    const given_W = (0.8 + 0.05 * (i % 4)) * share * unit.rated_power_W;
    const power_W = mode === 'stand' ? 0 : mode === 'charge' ? 1.5 * unit.rated_power_W : given_W;
    const from_ms = first_ms + i * 900_000;
    return { mode, power_W, from_ms, to_ms: from_ms + 900_000 } as const;
  });
  return { kind: 'schedule', ask: { blocks, certainty: 0.9, zone: 'Europe/Berlin' } };
}

async function fullState(unit: UnitDefinition, file: string): Promise<UnitState> {
  const state = startUnit(unit);
  const reader = new RecordingReader(file, unit, { otherChannels: new Set() });
  let done = 0;
  for await (const batch of reader.batches()) {
    for (const scan of batch) {
      advance(unit, state, scan, { hours_at_W: [], profile: false });
      if (++done === SCANS) return state;
    }
  }
  throw new RangeError(`${file}: expected at least ${SCANS} scans, got ${done}`);
}
