import { existsSync, readFileSync } from 'node:fs';
import { join } from 'node:path';
import { describe, expect, it } from 'vitest';
import { z } from 'zod';
import { estimateSchema } from '../../src/adapters/http/schema/estimate.js';
import { INTAKE_COUNTS } from '../../src/adapters/mqtt/intake.js';
import { END_CAUSES, FRONT_REASONS, QUALITIES, SENSOR_VERDICTS } from '../../src/core/estimate.js';
import { READING_FATES } from '../../src/core/scan/assemble.js';
import { TUNE_REASONS } from '../../src/core/tune/result.js';
import { EVENT_KINDS } from '../../src/core/watch/event.js';
import { KIND_CLASSES } from '../../src/core/watch/kinds.js';
import { EXIT_CODES } from '../../src/errors.js';
import { code, root, sources } from './imports.js';

const read = (file: string) => readFileSync(join(root, file), 'utf8');
const readme = read('README.md');
const DOCUMENTS = { 'README.md': readme, 'DEVELOPERS.md': read('DEVELOPERS.md') };
const both = Object.entries(DOCUMENTS);

/** Lines of a table whose first cell is this text in code marks, or this text alone. */
function rows(text: string, first: string): string[] {
  return text
    .split('\n')
    .filter((line) => line.startsWith(`| \`${first}\` |`) || line.startsWith(`| ${first} |`));
}

/** Whether the text names this word in code marks, alone or with others. */
const names = (text: string, word: string) =>
  new RegExp(
    `\`[^\`\n]*(?<![\\w.-])${word.replace(/[.*+?^${}()|[\]\\]/g, '\\$&')}(?![\\w-])[^\`\n]*\``,
  ).test(text);

const missing = (words: readonly string[], text = readme) =>
  words.filter((word) => !names(text, word));

/** What each file of src says by a pattern with one group. */
function found(folder: string, pattern: RegExp): string[] {
  return sources(folder).flatMap((file) =>
    [...code(file).matchAll(pattern)].map(([, word]) => word as string),
  );
}

/** Names of all keys of an object schema, those within it included. */
function keysOf(schema: unknown): string[] {
  if (schema instanceof z.ZodNullable) return keysOf(schema.unwrap());
  if (schema instanceof z.ZodArray) return keysOf(schema.element);
  if (schema instanceof z.ZodRecord) return keysOf(schema.valueType);
  if (!(schema instanceof z.ZodObject)) return [];
  return Object.entries(schema.shape).flatMap(([key, part]) => [key, ...keysOf(part)]);
}

describe('README.md names everything that a user meets', () => {
  it('each command, with an example and with every option of its own', () => {
    const commands = found(
      'src/commands',
      /(?:\.command\(|aheadCommand\(\s*program,\s*)'([a-z]+)'/g,
    );
    const registered = [...code('src/main.ts').matchAll(/import\('\.\/commands\//g)];
    expect(commands.length).toBeGreaterThan(7);
    expect(commands).toHaveLength(registered.length);
    for (const command of commands) {
      const [examples, options] = rows(readme, command);
      expect(examples, command).toContain(`\`rockhour ${command} --`);
      const text = code(`src/commands/${command}.ts`);
      // With the options that all questions about what lies ahead share.
      const shared = text.includes('aheadCommand(') ? code('src/commands/aheadState.ts') : '';
      const own = [...(text + shared).matchAll(/'--([a-z-]+)[ ']/g)];
      expect(own.length, command).toBeGreaterThan(1);
      for (const [, option] of own) expect(options, command).toContain(`\`--${option}\``);
    }
  });

  it('each exit code with its meaning', () => {
    for (const { code: number, meaning } of Object.values(EXIT_CODES)) {
      expect(rows(readme, String(number))).toEqual([`| ${number} | ${meaning} |`]);
    }
  });

  it('each route', () => {
    const routes = found('src/adapters/http/routes', /'(\/(?:api\/|metrics)[^']*)'/g);
    expect(routes.length).toBeGreaterThan(12);
    const shown = routes.map((route) => route.replace(/:(\w+)/g, '{$1}'));
    expect(missing(shown)).toEqual([]);
  });

  it('each topic that is published', () => {
    const topics = found('src/adapters/mqtt', /`\$\{[\w.]*unit\}\/(\w+)`/g);
    expect(topics.length).toBeGreaterThan(2);
    expect(
      missing([...topics.map((name) => `rockhour/UNIT/${name}`), 'rockhour/heartbeat']),
    ).toEqual([]);
  });

  it('each field of an estimate, in SI and at the edge', () => {
    const keys = new Set(keysOf(estimateSchema));
    expect(keys.size).toBeGreaterThan(30);
    expect(missing([...keys, 'outlet_K', 'dispatch', 'power_MW', 'ends_by', 'events'])).toEqual([]);
  });

  it.each([
    ['quality', QUALITIES],
    ['reason without a front', FRONT_REASONS],
    ['cause of an end', END_CAUSES],
    ['verdict on a sensor', SENSOR_VERDICTS],
    ['reason of a value that is not tuned', TUNE_REASONS],
  ])('each %s, in a row of its own that explains it', (_, words) => {
    expect(words.filter((word) => !rows(readme, word).some((row) => row.length > 30))).toEqual([]);
  });

  it('each kind of event with its class and priority', () => {
    for (const kind of EVENT_KINDS) {
      const { class: which, priority } = KIND_CLASSES[kind];
      // An indicator may have the name of its event.
      const told = rows(readme, kind).filter((row) => row.includes(`| ${which} | ${priority} |`));
      expect(told, kind).toHaveLength(1);
    }
  });

  it('each count of what came in and could not be used as it was', () => {
    const fine = ['messages', 'readings', 'taken'];
    const counts = [...INTAKE_COUNTS, ...READING_FATES].filter((name) => !fine.includes(name));
    expect(missing(counts)).toEqual([]);
  });

  it('each measurement in InfluxDB', () => {
    const measurements = found('src/adapters/history', /'(rockhour_\w+)'/g);
    expect(new Set(measurements).size).toBeGreaterThan(5);
    expect(missing(measurements)).toEqual([]);
  });

  it('each npm script, each example and each database file', () => {
    const { scripts } = JSON.parse(read('package.json')) as { scripts: Record<string, string> };
    const short = ['start', 'test'];
    for (const name of Object.keys(scripts)) {
      expect(names(readme, `npm ${short.includes(name) ? '' : 'run '}${name}`), name).toBe(true);
    }
    for (const file of ['demo', 'hot-air', 'salt-thermocline']) {
      expect(readme).toContain(`(config/${file}.yaml)`);
    }
    expect(missing([...new Set(found('src', /'(\w+\.sqlite)'/g))])).toEqual([]);
  });

  it('each variable of the environment, here or in DEVELOPERS.md', () => {
    const text = Object.values(DOCUMENTS).join('\n');
    const used = [...sources('src'), ...sources('test/support')].flatMap((file) =>
      [...code(file).matchAll(/process\.env\.(ROCKHOUR_\w+)/g)].map(([, name]) => name as string),
    );
    expect(used.length).toBeGreaterThan(1);
    expect(missing(used, text)).toEqual([]);
  });
});

describe.each(both)('%s', (_, text) => {
  it('names only files and folders that exist', () => {
    const top = /^(src|test|tools|config|fixtures|bin|\.ci)\/[\w./-]+$/;
    const links = [...text.matchAll(/\]\(([^)#]+)(?:#[^)]*)?\)/g)].map(
      ([, path]) => path as string,
    );
    const marked = [...text.matchAll(/`([^`\n]+)`/g)]
      .flatMap(([, span]) => (span as string).split(/[\s,]+/))
      .filter((word) => top.test(word));
    expect(links.length + marked.length).toBeGreaterThan(5);
    expect([...links, ...marked].filter((path) => !existsSync(join(root, path)))).toEqual([]);
  });

  it('has a heading for each of its links within', () => {
    const anchor = (heading: string) =>
      heading
        .toLowerCase()
        .replace(/[^\w -]/g, '')
        .replaceAll(' ', '-');
    for (const [, file, to] of text.matchAll(/\]\(([\w.]*)#([^)]+)\)/g)) {
      const target = file === '' ? text : read(file as string);
      const headings = [...target.matchAll(/^#+ (.*)$/gm)].map(([, words]) =>
        anchor(words as string),
      );
      expect(headings).toContain(to);
    }
  });

  it('names no place outside the project: no host but this machine, no folder but the image', () => {
    const hosts = [...text.matchAll(/\b[a-z]+:\/\/([^\s/:)"'`]+)/g)].map(([, host]) => host);
    expect(hosts.filter((host) => host !== '127.0.0.1')).toEqual([]);
    const inside = /^(api|metrics|data|config|var\/lib\/rockhour|UNIT|STORE|CHANNEL|STRING)\b/;
    const absolute = [...text.matchAll(/(?<![\w.:)}\]/*-])\/([A-Za-z][\w/.-]*)/g)].map(
      ([, path]) => path as string,
    );
    expect(absolute.filter((path) => !inside.test(path))).toEqual([]);
  });

  it('shows in its blocks only commands of the project and of usual tools', () => {
    const blocks = [...text.matchAll(/^```(\w*)\n([\s\S]*?)^```/gm)].flatMap(
      ([, language, block]) => (language === '' || language === 'sh' ? [block] : []),
    );
    const first = blocks
      .flatMap((block) => (block as string).split('\n'))
      .map((line) => /^([a-z][\w.-]*) (?=[a-z-])/.exec(line)?.[1])
      .filter((word) => word !== undefined);
    const known = ['npm', 'npx', 'node', 'rockhour', 'curl', 'docker', 'ready'];
    expect(first.filter((word) => !known.includes(word))).toEqual([]);
  });

  it('keeps its lines within a page and its tables whole', () => {
    let columns = 0;
    text.split('\n').forEach((line, i) => {
      if (!line.startsWith('|')) {
        columns = 0;
        // A link or a table row cannot be broken.
        if (!line.includes('](') && !/^(ready|plant\/)/.test(line)) {
          expect(line.length, `line ${i + 1}`).toBeLessThanOrEqual(104);
        }
        return;
      }
      const count = line.replace(/`[^`]*`/g, '').split('|').length;
      if (columns > 0) expect(count, `line ${i + 1}`).toBe(columns);
      columns = count;
    });
  });
});
