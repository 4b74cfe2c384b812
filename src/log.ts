import { type DestinationStream, type Logger, pino, stdSerializers } from 'pino';
import pretty from 'pino-pretty';
import { withoutCredentials } from './errors.js';

export type Log = Logger;

export const LOG_LEVELS = ['silent', 'error', 'warn', 'info', 'debug', 'trace'] as const;
export type LogLevel = (typeof LOG_LEVELS)[number];

const SECRETS = ['password', 'token', 'secret', 'authorization', 'cookie'];

export interface LogOptions {
  readonly level?: LogLevel;
  /** For people instead of machines; by default where standard error is a terminal. */
  readonly pretty?: boolean;
  /** Where the lines go; standard error by default, which leaves standard output to answers. */
  readonly destination?: DestinationStream;
}

/** A daemon whose log nobody reads any more still has a plant to watch. */
function standardError(): DestinationStream {
  const target = pino.destination({ fd: 2, sync: true });
  target.on('error', () => undefined);
  return target;
}

/**
 * The log of a process: one JSON line per entry, or coloured text on a terminal. Passwords,
 * tokens and the credentials inside URLs are masked wherever they stand in an entry.
 */
export function createLog(options: LogOptions = {}): Log {
  const forPeople = options.pretty ?? (options.destination === undefined && process.stderr.isTTY);
  const target = options.destination ?? standardError();
  return pino(
    {
      level: options.level ?? 'info',
      base: null,
      timestamp: pino.stdTimeFunctions.isoTime,
      formatters: { level: (label) => ({ level: label }) },
      redact: {
        paths: SECRETS.flatMap((key) => [key, `*.${key}`, `*.*.${key}`]),
        censor: '***',
      },
      serializers: {
        // An error of the influx client holds its response, which is circular: only the words.
        err: (error: Error) => {
          const { type, message, stack } = stdSerializers.err(error);
          return { type, message, stack };
        },
      },
      // The finished line, so that no path into an entry is forgotten.
      hooks: { streamWrite: withoutCredentials },
    },
    forPeople
      ? pretty({
          colorize: process.stderr.hasColors?.() ?? false,
          destination: target,
          sync: true,
          translateTime: 'SYS:HH:MM:ss',
        })
      : target,
  );
}
