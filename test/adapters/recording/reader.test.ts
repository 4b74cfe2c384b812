import { describe, expect, it } from 'vitest';
import type { RecordedUnit } from '../../../src/adapters/recording/columns.js';
import { millivoltFromCelsius } from '../../../src/core/thermocouple/its90.js';
import { RockhourError } from '../../../src/errors.js';
import { channel, read, SMALL, thermocouple } from './small.js';

const HEADER = 'time,T1,T2,flow,mode,power\n';

function codeOf(fault: unknown): string {
  expect(fault).toBeInstanceOf(RockhourError);
  return (fault as RockhourError).code;
}

describe('a recording', () => {
  it('becomes scans in SI units, in the order of the channels, whatever that of the columns', async () => {
    const { scans, fault } = await read('power,T2,time,T1,mode,flow\n2,20,60,500,charge,-3.6\n');
    expect(fault).toBeNull();
    expect(scans).toHaveLength(1);
    expect(scans[0]?.time_ms).toBe(60_000);
    // 3.6 / 3.6 in two roundings: one unit in the last place.
    const [T1, T2, flow, mode, power] = [...(scans[0]?.values ?? [])];
    expect([T1, T2, mode, power]).toEqual([773.15, 293.15, 1, 2e6]);
    expect(flow).toBeCloseTo(-1, 15);
  });

  it('keeps rows with nothing in them, and takes the end of the line as it comes', async () => {
    const lines = ['\ufefftime,T1,T2,flow,mode,power', '0,,,,,', '30,NaN,nan,,,', '60,1,2,3,0,'];
    const unix = await read(lines.join('\n'));
    const windows = await read(`${lines.join('\r\n')}\r\n`);
    expect(unix.scans).toHaveLength(3);
    expect(windows.scans).toEqual(unix.scans);
    expect([...(unix.scans[0]?.values ?? [])].every(Number.isNaN)).toBe(true);
    expect(unix.reader.counts).toMatchObject({ rows: 3, text: 0, repeated: 0 });
  });

  it('counts text where a number belongs and says where it stands', async () => {
    const { scans, reader } = await read(
      `${HEADER}0,Bad,1,2,stand,"I/O, timeout"\n30,0x1F,1e999,1,2,3\n`,
    );
    expect(reader.counts.text).toBe(4);
    expect(reader.counts.textExamples).toEqual([
      'row 2, T1: "Bad"',
      'row 2, power: "I/O, timeout"',
      'row 3, T1: "0x1F"',
    ]);
    expect(scans[0]?.values[0]).toBeNaN();
    expect(scans[0]?.values[1]).toBe(274.15);
    // 2 is no mode.
    expect(scans[1]?.values[3]).toBeNaN();
  });

  it('lets the last of several rows of one time win, and counts the others', async () => {
    const { scans, reader } = await read(
      `${HEADER}1970-01-01T00:00:30Z,1,1,,,\n30,2,,,,\n1970-01-01T01:00:30+01:00,3,,,,\n60,4,4,,,\n`,
    );
    expect(scans.map((scan) => [scan.time_ms, scan.values[0], scan.values[1]])).toEqual([
      [30_000, 276.15, Number.NaN],
      [60_000, 277.15, 277.15],
    ]);
    expect(reader.counts).toMatchObject({ rows: 4, repeated: 2 });
  });

  it('names the row where time runs back, and gives the scans before it', async () => {
    const { scans, fault } = await read(`${HEADER}0,1,1,,,\n60,1,1,,,\n30,1,1,,,\n90,1,1,,,\n`);
    expect(codeOf(fault)).toBe('RECORDING_TIME_BACK');
    expect((fault as Error).message).toContain('row 4');
    expect(scans.map((scan) => scan.time_ms)).toEqual([0, 60_000]);
  });

  it('names unknown columns once and ignores them, but not those of other units', async () => {
    const { scans, reader, fault } = await read(
      'time,T1,T2,flow,remark,U2_T1,pump\n0,1,2,3,"all, well",9,1\n30,1,2,3,,9,1\n',
      SMALL,
      { otherChannels: new Set(['U2_T1']) },
    );
    expect(fault).toBeNull();
    expect(scans).toHaveLength(2);
    expect(reader.counts.unknownColumns).toEqual(['remark', 'pump']);
    expect(reader.counts.absentChannels).toEqual(['mode', 'power']);
  });

  it.each([
    ['T1,T2,flow\n', 'no column time'],
    ['time,T1,flow\n', 'no column T2'],
    ['time,T1,T2,mode\n', 'no column flow'],
    ['time\n', 'no column T1, T2, flow'],
  ])('refuses the header %j', async (text, words) => {
    const { fault } = await read(text);
    expect(codeOf(fault)).toBe('RECORDING_COLUMN_MISSING');
    expect((fault as Error).message).toContain(words);
  });

  it('takes power instead of flow, and needs both meters where each direction has one', async () => {
    expect((await read('time,T1,T2,power\n0,1,2,3\n')).fault).toBeNull();
    const two: RecordedUnit = {
      id: 'U1',
      channels: [
        thermocouple('T1'),
        channel('in', { kind: 'flow', sense: 'charge' }, 'kg/s'),
        channel('back', { kind: 'flow', sense: 'discharge' }, 'kg/s'),
      ],
    };
    expect((await read('time,T1,in,back\n0,1,2,3\n', two)).fault).toBeNull();
    const { fault } = await read('time,T1,in\n0,1,2\n', two);
    expect((fault as Error).message).toContain('no column back');
  });

  it.each([
    ['', 'is empty', 'RECORDING_MALFORMED'],
    ['time;T1;T2;flow\n0;1;2;3\n', 'semicolons', 'RECORDING_MALFORMED'],
    ['time,T1,T1,T2,flow\n', 'twice', 'RECORDING_MALFORMED'],
    [`${HEADER}2025-03-01T06:00:00,1,2,3,,\n`, 'row 2', 'RECORDING_MALFORMED'],
    [`${HEADER}0,1,2,3,,\n,1,2,3,,\n`, 'row 3', 'RECORDING_MALFORMED'],
    [`${HEADER}0,1,2,3,,"\n30,1,2,3,,\n`, 'does not end', 'RECORDING_MALFORMED'],
  ])('answers %j with one clear error', async (text, words, code) => {
    const { fault } = await read(text);
    expect(codeOf(fault)).toBe(code);
    expect((fault as Error).message).toContain(words);
  });

  it('says that UTF-16 is none of its texts, and that a file is not there', async () => {
    const { fault } = await read(Buffer.from('\ufefftime,T1\n', 'utf16le'));
    expect((fault as RockhourError).message).toContain('UTF-16');
    const { RecordingReader } = await import('../../../src/adapters/recording/reader.js');
    const absent = new RecordingReader('/no/such/file.csv', SMALL);
    await expect(absent.batches().next()).rejects.toMatchObject({ code: 'RECORDING_UNREADABLE' });
  });

  it('takes what a short row has, and nothing of a last field that was cut off', async () => {
    const { scans, reader } = await read(`${HEADER}0,1,2\n30,1,2,3,0,1,surplus\n60,500.1,48`);
    expect(reader.counts).toMatchObject({ shortRows: 2, longRows: 1 });
    expect(scans[0]?.values[1]).toBe(275.15);
    expect(scans[2]?.values[0]).toBe(773.25);
    expect(scans[2]?.values[1]).toBeNaN();
  });

  it('reads the same in pieces of three bytes, characters of several bytes included', async () => {
    const text = `time,T1,T2,flow,Bemerkung\r\n0,1,2,3,"Größe ""°C"", ok"\r\n30,2,3,4,µ\r\n30,5,6,7,\r\n`;
    const whole = await read(text);
    const pieces = await read(text, SMALL, { piece_bytes: 3 });
    expect(pieces.scans).toEqual(whole.scans);
    expect(pieces.reader.counts).toEqual(whole.reader.counts);
  });

  it('holds a silent channel that reports by exception, and not one that said NaN', async () => {
    const unit: RecordedUnit = {
      id: 'U1',
      channels: [
        thermocouple('T1', {
          reporting: { kind: 'by_exception', deadband: 0.5, longest_silence_s: 60 },
        }),
        channel('flow', { kind: 'flow', sense: 'signed' }, 'kg/s'),
      ],
    };
    const { scans, reader } = await read(
      'time,T1,flow\n0,,1\n30,100,1\n60,,\n90,,1\n91,,1\n120,101,1\n150,NaN,1\n180,,1\n',
      unit,
    );
    const T1 = scans.map((scan) => scan.values[0]);
    const nan = Number.NaN;
    expect(T1).toEqual([nan, 373.15, 373.15, 373.15, nan, 374.15, nan, nan]);
    expect(scans.map((scan) => scan.held[0])).toEqual([0, 0, 1, 1, 0, 0, 0, 0]);
    expect(scans[2]?.values[1]).toBeNaN();
    expect(reader.counts.held).toBe(2);
  });

  it('turns millivolts into kelvin with the cold junction of the same row', async () => {
    const mV = (id: string, cold_junction: string | number | null) =>
      thermocouple(id, { thermocouple_type: 'K', cold_junction }, 'mV');
    const unit: RecordedUnit = {
      id: 'U1',
      channels: [
        mV('T1', 'cj'),
        mV('T2', 298.15),
        mV('T3', null),
        channel('cj', { kind: 'cold_junction', group: 'card' }, 'degC'),
        channel('flow', { kind: 'flow', sense: 'signed' }, 'kg/s'),
      ],
    };
    // What a junction at 500 degC gives at terminals of 30 and of 25 degC, and at the ice point.
    const at = (cold: number) => millivoltFromCelsius('K', 500) - millivoltFromCelsius('K', cold);
    const { scans } = await read(
      `time,T1,T2,T3,cj,flow\n0,${at(30)},${at(25)},${at(0)},30,1\n30,${at(30)},${at(25)},99,,1\n`,
      unit,
    );
    // The inverse is solved to 1e-9 K; the voltages are doubles of order 20 mV at 40 uV/K.
    for (let i = 0; i < 3; i++)
      expect(Math.abs((scans[0]?.values[i] ?? 0) - 773.15)).toBeLessThan(1e-8);
    expect(scans[1]?.values[0]).toBeNaN();
    expect(scans[1]?.values[2]).toBeNaN();
    const { fault } = await read('time,T1,T2,T3,flow\n0,1,2,3,4\n', unit);
    expect((fault as Error).message).toContain('no column cj');
  });
});
