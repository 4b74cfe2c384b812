import { describe, expect, it } from 'vitest';
import { code, type Import, importsOf, sources } from './imports.js';

interface Rule {
  /** Folder or file that the rule is for; the first that fits counts. */
  readonly of: RegExp;
  /** What may be imported. */
  readonly may: readonly RegExp[];
  /** What may be imported for its types alone. */
  readonly mayTypes?: readonly RegExp[];
}

const errors = /^src\/(errors|log)$/;
const core = /^src\/core\//;
const configTypes = /^src\/config\/site$/;
const node = /^node$/;
/** Tokens and roles: what HTTP and the own broker both ask for. */
const access = /^src\/access\//;

/** An adapter: core, types of config, errors, log, its own files and its own library. */
function adapter(name: string, ...libraries: RegExp[]): Rule {
  return {
    of: new RegExp(`^src/adapters/${name}/`),
    may: [core, errors, node, access, new RegExp(`^src/adapters/${name}/`), ...libraries],
    mayTypes: [configTypes],
  };
}

/** Who may import what, as in the design. Who stands in no rule may import nothing. */
const RULES: readonly Rule[] = [
  { of: /^src\/core\/track\/scalarFilter\.ts$/, may: [core, /^kalmanjs$/] },
  { of: /^src\/core\/plan\/(ceilings|localTime)\.ts$/, may: [core, /^luxon$/] },
  { of: /^src\/core\//, may: [core, /^ml-levenberg-marquardt$/] },
  // A bundle for the browser: nothing of the program itself runs there.
  {
    of: /^src\/adapters\/page\/vite\.config\.ts$/,
    may: [/^vite$/, node],
  },
  {
    of: /^src\/adapters\/page\//,
    // The tables of what is watched are plain values without a library: the page shows them as they are.
    may: [
      /^uplot$/,
      /^preact(\/|$)/,
      /^@preact\/signals$/,
      /^src\/core\/watch\/(causeTable|kinds|side)$/,
      /^src\/adapters\/page\//,
    ],
    mayTypes: [core, /^src\/adapters\/http\//],
  },
  adapter('mqtt', /^mqtt$/, /^aedes$/, /^protobufjs\b/),
  adapter('history', /^better-sqlite3$/, /^influx$/),
  adapter(
    'http',
    /^fastify$/,
    /^@fastify\//,
    /^fastify-type-provider-zod$/,
    /^zod$/,
    /^prom-client$/,
  ),
  adapter('recording'),
  adapter('notify'),
  adapter('report', /^d3-(scale|shape)$/),
  { of: /^src\/access\//, may: [access, /^src\/errors$/, node] },
  {
    of: /^src\/config\//,
    may: [/^src\/config\//, access, core, /^src\/errors$/, /^zod$/, /^yaml$/, node],
  },
  {
    of: /^src\/plant\//,
    may: [
      /^src\/plant\//,
      /^src\/core\/machine\//,
      /^src\/core\/bed\/(solids|fluids)/,
      // Pure values and checks that the materials themselves stand on.
      /^src\/core\/(misuse|polynomial|units)$/,
    ],
    mayTypes: [core],
  },
  {
    of: /^src\/commands\//,
    may: [
      /^src\/commands\//,
      /^src\/daemon(\/|$)/,
      /^src\/config\//,
      access,
      core,
      /^src\/adapters\/(recording|history|report)\//,
      errors,
      /^commander$/,
      /^cli-progress$/,
      node,
    ],
  },
  { of: /^src\/(daemon|worker)(\/|\.ts)/, may: [/./] },
  { of: /^src\/main\.ts$/, may: [/^src\/commands\//, /^src\/errors$/, /^commander$/, node] },
  { of: /^src\/log\.ts$/, may: [/^src\/errors$/, /^pino(-pretty)?$/] },
  { of: /^src\/errors\.ts$/, may: [] },
];

function breach({ from, to, typeOnly }: Import): string | null {
  const rule = RULES.find(({ of }) => of.test(from));
  const fits = (patterns: readonly RegExp[] = []) => patterns.some((pattern) => pattern.test(to));
  if (fits(rule?.may) || (typeOnly && fits(rule?.mayTypes))) return null;
  return `${from} imports ${typeOnly ? 'types of ' : ''}${to}`;
}

describe('the table of imports', () => {
  it('is kept by every file of src', () => {
    const files = sources('src');
    expect(files.length).toBeGreaterThan(20);
    expect(
      files
        .flatMap((file) => importsOf(file))
        .map(breach)
        .filter(Boolean),
    ).toEqual([]);
  });

  it('has no file outside it', () => {
    expect(sources('src').filter((file) => !RULES.some(({ of }) => of.test(file)))).toEqual([]);
  });

  it.each([
    ['src/core/bed/a.ts', "import { readFileSync } from 'node:fs';"],
    ['src/core/bed/a.ts', "import kalman from 'kalmanjs';"],
    ['src/core/bed/a.ts', "export * from '../../errors.js';"],
    ['src/core/unit.ts', "const x = await import('../config/load.js');"],
    ['src/adapters/mqtt/a.ts', "import { x } from '../history/journal.js';"],
    ['src/adapters/mqtt/a.ts', "import type { x } from '../history/journal.js';"],
    ['src/adapters/http/a.ts', "import { loadSite } from '../../config/load.js';"],
    ['src/adapters/http/a.ts', "import { a, type B } from '../../config/site.js';"],
    ['src/adapters/page/a.ts', "import { x } from '../http/views.js';"],
    ['src/config/a.ts', "import Database from 'better-sqlite3';"],
    ['src/plant/a.ts', "import { advance } from '../core/unit.js';"],
    ['src/commands/a.ts', "import { x } from '../adapters/mqtt/client.js';"],
    ['src/elsewhere/a.ts', "import { x } from '../errors.js';"],
    ['src/core/bed/a.ts', "const fs = require('fs');"],
    ['src/core/bed/a.ts', "import 'fs/promises';"],
  ])('%s may not: %s', (file, text) => {
    const found = importsOf(file, text);
    expect(found).toHaveLength(1);
    expect(found.map(breach)).not.toContain(null);
  });

  it.each([
    ['src/core/track/scalarFilter.ts', "import KalmanFilter from 'kalmanjs';"],
    ['src/adapters/mqtt/a.ts', "import type { MqttConfig } from '../../config/site.js';"],
    ['src/adapters/mqtt/a.ts', "import {\n  type MqttConfig,\n} from '../../config/site.js';"],
    ['src/adapters/page/a.ts', "import type { UnitState } from '../http/schema/answers.js';"],
    ['src/daemon.ts', "import { x } from './adapters/mqtt/client.js';"],
  ])('%s may: %s', (file, text) => {
    const found = importsOf(file, text);
    expect(found).toHaveLength(1);
    expect(found.map(breach)).toEqual([null]);
  });
});

describe('the core', () => {
  it('has no clock, no chance, no environment and no output', () => {
    const impure =
      /\b(Date\.now|new Date\(\)|performance\.|Math\.random|process\.|console\.|setTimeout|setInterval|setImmediate|fetch\()/;
    const found = sources('src/core').flatMap((file) =>
      code(file)
        .split('\n')
        .filter((line) => impure.test(line))
        .map((line) => `${file}: ${line.trim()}`),
    );
    expect(found).toEqual([]);
  });
});

describe('the finer plant that scores the filter', () => {
  it('imports nothing from src', () => {
    const files = sources('test/plant').filter((file) => !file.endsWith('.test.ts'));
    expect(files.length).toBeGreaterThan(0);
    const found = files
      .flatMap((file) => importsOf(file))
      .filter(({ to }) => to.startsWith('src/'));
    expect(found).toEqual([]);
  });
});
