import { fileURLToPath } from 'node:url';
import { pino } from 'pino';
import { type Browser, chromium, type Page } from 'playwright-core';
import { build } from 'vite';
import type { Access } from '../../../src/access/access.js';
import { createHttpServer, type HttpServer } from '../../../src/adapters/http/server.js';
import type { HttpTuning } from '../../../src/adapters/http/tuning.js';
import { temporaryFolder } from '../../support/folders.js';
import type { ScriptedPlant } from '../http/scriptedPlant.js';

const CONFIG = fileURLToPath(new URL('../../../src/adapters/page/vite.config.ts', import.meta.url));

const ARGUMENTS = [
  '--no-sandbox',
  '--disable-gpu',
  '--disable-quic',
  '--no-first-run',
  '--disable-background-networking',
  '--disable-component-update',
  '--disable-sync',
  '--disable-dev-shm-usage',
];

export function openBrowser(
  executablePath: string,
  further: readonly string[] = [],
): Promise<Browser> {
  return chromium.launch({ executablePath, args: [...ARGUMENTS, ...further] });
}

/** Builds the page as it is shipped, into a folder of the test's own. */
export async function buildPage(): Promise<string> {
  const outDir = temporaryFolder('page');
  await build({ configFile: CONFIG, logLevel: 'error', build: { outDir } });
  return outDir;
}

export interface Served {
  url: string;
  server: HttpServer;
}

export async function serve(
  plant: ScriptedPlant,
  pageFolder: string,
  options: {
    port?: number;
    prefix?: string;
    tuning?: Partial<HttpTuning>;
    access?: Access;
  } = {},
): Promise<Served> {
  const server = createHttpServer(
    plant,
    { host: '127.0.0.1', port: options.port ?? 0, path_prefix: options.prefix ?? '' },
    {
      log: pino({ level: 'silent' }),
      pageFolder,
      ...(options.access === undefined ? {} : { access: options.access }),
      tuning: { state_every_ms: 10, heartbeat_ms: 200, ...options.tuning },
    },
  );
  return { server, ...(await server.start()) };
}

/** A page, and everything it says or asks for that it should not. */
export async function openPage(
  browser: Browser,
  url: string,
  options: { width?: number; height?: number; dark?: boolean } = {},
) {
  const context = await browser.newContext({
    viewport: { width: options.width ?? 1280, height: options.height ?? 800 },
    colorScheme: options.dark ? 'dark' : 'light',
    timezoneId: 'UTC',
  });
  const page = await context.newPage();
  const said: string[] = [];
  const foreign: string[] = [];
  page.on('console', (message) => said.push(`${message.type()}: ${message.text()}`));
  page.on('pageerror', (error) => said.push(`error: ${error.message}`));
  page.on('request', (request) => {
    if (!request.url().startsWith(new URL(url).origin)) foreign.push(request.url());
  });
  await page.goto(url);
  return { page, said, foreign, close: () => context.close() };
}

/** Text of the one element with this data-field within a part of the page. */
export function field(page: Page, name: string, within = 'body') {
  return page.locator(`${within} [data-field="${name}"]`);
}
