import { expect, it } from 'vitest';
import { startStore } from '../../../src/core/track/storeTracker.js';
import { outOfUse } from '../../../src/core/worth/outOfUse.js';
import { hotStore, modelOf } from '../track/plants.js';

it('out of use is what has a verdict, but for a group at fault, which is used on', () => {
  const model = modelOf(hotStore());
  const state = startStore(model);
  expect(outOfUse(model, state)).toEqual([]);
  state.sensors[0]![2]!.verdict = 'group_fault';
  state.sensors[0]![3]!.verdict = 'group_fault';
  state.sensors[0]![5]!.verdict = 'open';
  for (const s of [2, 3, 5]) state.sensors[0]![s]!.since_ms = 0;
  expect(outOfUse(model, state).map(({ id, verdict }) => [id, verdict])).toEqual([['h_6', 'open']]);
});
