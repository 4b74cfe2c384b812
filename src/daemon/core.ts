import type { UnitDefinition } from '../core/definitions.js';
import type { DispatchAnswer } from '../core/estimate.js';
import { answerPlan, type PlanAnswer, type PlanQuestion } from '../core/plan/ask.js';
import type { Scan } from '../core/scan/scan.js';
import {
  advance,
  hoursAt,
  hoursDue,
  restoreUnit,
  saveUnit,
  startUnit,
  type UnitAsk,
  type UnitSnapshot,
  type UnitState,
  type UnitStep,
} from '../core/unit.js';
import { carryUnit, type UnitCarry } from '../core/unitCarry.js';
import type { UnitShape } from '../core/unitShape.js';
import { type UnitWorth, unitWorth } from '../core/worth/unitWorth.js';

/** What the daemon needs of the core; a test may put something small in its place. */
export interface Core {
  startUnit(unit: UnitDefinition): UnitState;
  advance(unit: UnitDefinition, state: UnitState, scan: Scan, ask: UnitAsk): UnitStep;
  saveUnit(state: UnitState): UnitSnapshot;
  restoreUnit(unit: UnitDefinition, snapshot: UnitSnapshot): UnitState;
  carryUnit(
    unit: UnitDefinition,
    fresh: UnitState,
    saved: UnitSnapshot,
    shape: UnitShape,
  ): UnitCarry;
  hoursAt(unit: UnitDefinition, state: UnitState, powers_W: readonly number[]): DispatchAnswer[];
  answerPlan(unit: UnitDefinition, state: UnitState, question: PlanQuestion): PlanAnswer;
  unitWorth(unit: UnitDefinition, state: UnitState | null): Generator<number, UnitWorth | null>;
  hoursDue(unit: UnitDefinition, last_ms: number | null, now_ms: number): boolean;
}

export const realCore: Core = {
  startUnit,
  advance,
  saveUnit,
  restoreUnit,
  carryUnit,
  hoursAt,
  answerPlan,
  unitWorth,
  hoursDue,
};
