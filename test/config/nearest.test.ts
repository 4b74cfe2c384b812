import { describe, expect, it } from 'vitest';
import { editDistance, nearest } from '../../src/config/nearest.js';

describe('edit distance', () => {
  // Textbook pairs; a swap of neighbours counts once.
  it.each([
    ['kitten', 'sitting', 3],
    ['flaw', 'lawn', 2],
    ['height', 'hieght', 1],
    ['', 'abc', 3],
    ['same', 'same', 0],
  ])('of %s and %s is %d', (a, b, distance) => {
    expect(editDistance(a, b)).toBe(distance);
    expect(editDistance(b, a)).toBe(distance);
  });
});

describe('the nearest word', () => {
  const known = ['height_m', 'diameter_m', 'particle_diameter_mm', 'solid', 'fluid'];
  it.each([
    ['heigth_m', 'height_m'],
    ['height', 'height_m'],
    ['height_mm', 'height_m'],
    ['Diameter-m', 'diameter_m'],
    ['particle_diameter_m', 'particle_diameter_mm'],
    ['colour', null],
    ['x', null],
  ])('to %s is %s', (word, expected) => {
    expect(nearest(word, known)).toBe(expected);
  });
});
