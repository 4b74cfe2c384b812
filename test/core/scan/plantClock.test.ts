import { expect, it } from 'vitest';
import { PlantClock } from '../../../src/core/scan/plantClock.js';

it('knows no time before the first reading', () => {
  expect(new PlantClock().at(5)).toBeNull();
});

it('runs on from the newest source time, however far that is from the clock of this machine', () => {
  const clock = new PlantClock();
  clock.observe(1_000_000, 50);
  expect(clock.at(50)).toBe(1_000_000);
  expect(clock.at(80)).toBe(1_000_030);
});

it('is not put back by an older reading nor by a steady clock that stood', () => {
  const clock = new PlantClock();
  clock.observe(1000, 10);
  clock.observe(900, 500);
  expect(clock.at(510)).toBe(1500);
  expect(clock.at(0)).toBe(1000);
});
