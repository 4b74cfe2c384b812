import { writeFileSync } from 'node:fs';
import { join } from 'node:path';
import { pino } from 'pino';
import type { Access } from '../../../src/access/access.js';
import { createHttpApp } from '../../../src/adapters/http/app.js';
import type { HttpTuning } from '../../../src/adapters/http/tuning.js';
import { temporaryFolder } from '../../support/folders.js';
import { ScriptedPlant } from './scriptedPlant.js';

/** The HTTP app over a scripted plant, without listening, and its log lines. */
export async function testApp(
  options: {
    prefix?: string;
    tuning?: Partial<HttpTuning>;
    plant?: ScriptedPlant;
    access?: Access;
    login_by_proxy?: boolean;
  } = {},
) {
  const plant = options.plant ?? new ScriptedPlant();
  const pageFolder = temporaryFolder('page');
  writeFileSync(join(pageFolder, 'index.html'), '<!doctype html><title>page</title>');
  const logged: string[] = [];
  const log = pino({ level: 'warn' }, { write: (line: string) => void logged.push(line) });
  const { app, stream } = await createHttpApp(plant, options.prefix ?? '', {
    log,
    pageFolder,
    ...(options.tuning === undefined ? {} : { tuning: options.tuning }),
    ...(options.access === undefined ? {} : { access: options.access }),
    ...(options.login_by_proxy === undefined ? {} : { login_by_proxy: options.login_by_proxy }),
  });
  const get = (url: string, headers: Record<string, string> = {}) =>
    app.inject({ method: 'GET', url, headers });
  return { app, stream, plant, logged, get };
}
