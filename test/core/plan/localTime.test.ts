import { describe, expect, it } from 'vitest';
import { blocksOfDay, instantOf, isTimeZone, writtenIn } from '../../../src/core/plan/localTime.js';

/**
 * The clocks of Europe/Paris change by an hour at 01:00 UTC on the last Sundays of March and October
 * (directive 2000/84/EC); Lord Howe Island changes by half an hour.
 */
const ZONE = 'Europe/Paris';

describe('a local day in blocks', () => {
  it.each([
    ['2026-03-29', 92, 46, 23],
    ['2026-03-30', 96, 48, 24],
    ['2026-10-25', 100, 50, 25],
  ])('%s has %i quarter-hours', (date, quarters, halves, hours) => {
    expect(blocksOfDay(date, ZONE, 15)).toHaveLength(quarters);
    expect(blocksOfDay(date, ZONE, 30)).toHaveLength(halves);
    expect(blocksOfDay(date, ZONE, 60)).toHaveLength(hours);
  });

  it('is without gaps from midnight to midnight, on days of a change too', () => {
    for (const date of ['2026-03-29', '2026-10-25']) {
      const blocks = blocksOfDay(date, ZONE, 15);
      blocks.slice(1).forEach(({ from_ms }, i) => {
        expect(from_ms).toBe(blocks[i]?.to_ms);
      });
      expect(writtenIn(ZONE, blocks[0]!.from_ms)).toMatch(new RegExp(`^${date}T00:00:00`));
      expect(writtenIn(ZONE, blocks.at(-1)!.to_ms)).toMatch(/T00:00:00/);
    }
  });

  it('ends with a shorter hour where the clocks change by half of one', () => {
    // 2026-04-05, from +11:00 to +10:30: 24.5 hours.
    const hours = blocksOfDay('2026-04-05', 'Australia/Lord_Howe', 60);
    expect(hours).toHaveLength(25);
    expect(hours.at(-1)!.to_ms - hours.at(-1)!.from_ms).toBe(1_800_000);
    expect(blocksOfDay('2026-04-05', 'Australia/Lord_Howe', 15)).toHaveLength(98);
  });

  it('refuses a day, a zone and a length that there are not', () => {
    expect(() => blocksOfDay('2026-02-29', ZONE, 15)).toThrow(
      /date = "2026-02-29": expected a day/,
    );
    expect(() => blocksOfDay('tomorrow', ZONE, 15)).toThrow(/date = "tomorrow"/);
    expect(() => blocksOfDay('2026-02-28', 'Europe/Atlantis', 15)).toThrow(/zone = "Europe\/Atl/);
    expect(() => blocksOfDay('2026-02-28', ZONE, 20 as 15)).toThrow(
      /minutes = 20: expected one of/,
    );
  });
});

describe('a time as it is written', () => {
  const ms = (text: string, zone: string | null = ZONE) => {
    const found = instantOf(text, zone);
    return 'ms' in found ? found.ms : found.expected;
  };

  it('counts by its offset, whatever the zone', () => {
    const noon = Date.UTC(2026, 6, 1, 12);
    for (const text of [
      '2026-07-01T12:00Z',
      '2026-07-01T14:00+02:00',
      '2026-07-01 14:00:00+0200',
      '2026-07-01T12:00:00,000 z',
      '2026-07-01T06:30-05:30',
    ]) {
      expect(ms(text)).toBe(noon);
      expect(ms(text, null)).toBe(noon);
    }
    expect(ms('2026-07-01T12:00:00.25Z')).toBe(noon + 250);
  });

  it('without an offset is local time', () => {
    expect(ms('2026-01-15T12:00')).toBe(Date.UTC(2026, 0, 15, 11));
    expect(ms('2026-07-15T12:00')).toBe(Date.UTC(2026, 6, 15, 10));
    // On either side of both changes.
    expect(ms('2026-03-29T01:59:59')).toBe(Date.UTC(2026, 2, 29, 0, 59, 59));
    expect(ms('2026-03-29T03:00')).toBe(Date.UTC(2026, 2, 29, 1));
    expect(ms('2026-10-25T01:59')).toBe(Date.UTC(2026, 9, 24, 23, 59));
    expect(ms('2026-10-25T03:00')).toBe(Date.UTC(2026, 9, 25, 2));
  });

  it('is refused where the clocks leave it out, with what would be right', () => {
    for (const text of ['2026-03-29T02:00', '2026-03-29T02:30', '2026-03-29T02:59:59']) {
      expect(ms(text)).toMatch(
        /exists in Europe\/Paris: the clocks go forward over it; with offset/,
      );
    }
    // Neither hour nor minute stays as written where midnight itself is left out.
    expect(ms('2024-03-31T00:30', 'Asia/Beirut')).toMatch(/the clocks go forward over it/);
  });

  it('is refused where the clocks show it twice, with both', () => {
    expect(ms('2026-10-25T02:30')).toBe(
      'an offset, since the clocks of Europe/Paris show this time twice: ' +
        '2026-10-25T02:30:00+02:00 or 2026-10-25T02:30:00+01:00',
    );
    expect(ms('2026-10-25T02:30+01:00')).toBe(Date.UTC(2026, 9, 25, 1, 30));
  });

  it('is refused where it is none', () => {
    for (const text of ['', 'noon', '2026-07-01', '1782000000', '2026-07-01T12:00 CET']) {
      expect(ms(text)).toMatch(/^a time in ISO 8601 with offset, as in/);
    }
    for (const text of ['2026-02-29T12:00Z', '2026-07-01T24:00Z', '2026-07-01T12:60Z']) {
      expect(ms(text)).toMatch(/of a day and time that exist$/);
    }
    expect(ms('2026-07-01T12:00+19:00')).toMatch(/its offset within 18 hours$/);
    expect(ms('2026-07-01T12:00', null)).toMatch(/or a time zone for local times$/);
    expect(() => ms('2026-07-01T12:00', 'Mars/Crater')).toThrow(/zone = "Mars\/Crater"/);
  });

  it('is written with the offset of its zone and read back the same', () => {
    for (const { from_ms } of blocksOfDay('2026-10-25', ZONE, 15)) {
      expect(ms(writtenIn(ZONE, from_ms), null)).toBe(from_ms);
    }
    expect(writtenIn(null, Date.UTC(2026, 9, 25, 1))).toBe('2026-10-25T01:00:00Z');
    expect(isTimeZone('Europe/Paris')).toBe(true);
    expect(isTimeZone('Europe/Atlantis')).toBe(false);
  });
});
