/**
 * Every failure that comes from outside the program: what a user typed, a file, a service. Misuse
 * inside the program is a RangeError, a numerical failure a returned reason, a bad reading data.
 */

/** How the process ends; the one table of it, printed by `rockhour --help`. */
export const EXIT_CODES = {
  ok: { code: 0, meaning: 'done, or stopped as asked (SIGINT, SIGTERM)' },
  usage: { code: 2, meaning: 'the command line or the configuration is wrong' },
  input: { code: 3, meaning: 'a recording cannot be used' },
  outside: { code: 4, meaning: 'a service, a port or the disk refused or did not answer' },
  interrupted: { code: 130, meaning: 'stopped by a signal before its work was done' },
  internal: { code: 70, meaning: 'a fault of rockhour itself' },
} as const;
export type ExitName = keyof typeof EXIT_CODES;

interface ErrorKind {
  readonly exit: ExitName;
  /** What the code stands for, for the list in the documentation. */
  readonly meaning: string;
  /** What to do where the place that failed knows nothing better. */
  readonly advice: string;
}

/** The catalogue. A test holds that each code is used somewhere in src. */
export const ERRORS = {
  USAGE: {
    exit: 'usage',
    meaning: 'A command, option or value on the command line is not one that rockhour knows.',
    advice: 'See rockhour --help, or --help after the command.',
  },
  CONFIG_UNREADABLE: {
    exit: 'usage',
    meaning: 'The configuration file cannot be read, or is not YAML.',
    advice: 'Check the path given with --config and the place named.',
  },
  CONFIG_INVALID: {
    exit: 'usage',
    meaning: 'The configuration has faults; all of them are listed.',
    advice: 'Mend them and run rockhour check --config FILE until it finds none.',
  },
  UNIT_UNKNOWN: {
    exit: 'usage',
    meaning: 'The unit asked for is not in the configuration, or several are and none was named.',
    advice: 'Name one with --unit.',
  },
  RECORDING_UNREADABLE: {
    exit: 'input',
    meaning: 'The recording cannot be opened or read.',
    advice: 'Check the path given with --recording.',
  },
  RECORDING_MALFORMED: {
    exit: 'input',
    meaning: 'The recording is not CSV after RFC 4180, or a time in it cannot be read.',
    advice: 'Fields are separated by commas; times are ISO 8601 with an offset, or seconds.',
  },
  RECORDING_COLUMN_MISSING: {
    exit: 'input',
    meaning: 'The recording lacks a column without which nothing can be estimated.',
    advice: 'Columns are named as the channels of the configuration.',
  },
  RECORDING_TIME_BACK: {
    exit: 'input',
    meaning: 'Time runs back in the recording.',
    advice: 'Sort the rows by time, or split the recording there.',
  },
  RECORDING_TELLS_NOTHING: {
    exit: 'input',
    meaning: 'The recording can be read, but nothing can be tuned to it; the message says why.',
    advice: 'Take a recording of at least a charge and a discharge, with all channels.',
  },
  OUTPUT_UNWRITABLE: {
    exit: 'outside',
    meaning: 'An output file cannot be written.',
    advice: 'Check that the folder exists, that it may be written to and that the disk has room.',
  },
  DAEMON_UNREACHABLE: {
    exit: 'outside',
    meaning: 'No rockhour daemon answers at the address given.',
    advice: 'Check the address and that the daemon runs.',
  },
  DAEMON_REFUSED: {
    exit: 'outside',
    meaning: 'The daemon answered a request with an error.',
    advice: 'The answer says why.',
  },
  PORT_IN_USE: {
    exit: 'outside',
    meaning: 'A port that rockhour should listen on cannot be had.',
    advice: 'Stop the program that holds it, or configure another port.',
  },
  BROKER_UNREACHABLE: {
    exit: 'outside',
    meaning: 'The MQTT broker does not answer or refuses the connection.',
    advice: 'Check mqtt.url, the user name and the password, and that the broker runs.',
  },
  STORE_FAILED: {
    exit: 'outside',
    meaning: 'The local store (SQLite) cannot be opened or written.',
    advice: 'Check store.folder, its permissions and the room on the disk.',
  },
  INTERRUPTED: {
    exit: 'interrupted',
    meaning: 'A command was stopped by a signal before it had done its work.',
    advice: 'Run it again for all of it; lines that it has written are whole.',
  },
  INTERNAL: {
    exit: 'internal',
    meaning: 'Something happened that rockhour does not expect: a fault of its own.',
    advice: 'Run it again with ROCKHOUR_DEBUG=1 to see where, and report it with that output.',
  },
} as const satisfies Readonly<Record<string, ErrorKind>>;
export type ErrorCode = keyof typeof ERRORS;

/**
 * A failure of the catalogue. `message` says what was asked of whom and what came back; `advice`
 * says what to do, from the catalogue unless the place that failed knows better.
 */
export class RockhourError extends Error {
  override readonly name = 'RockhourError';
  readonly advice: string;

  constructor(
    readonly code: ErrorCode,
    message: string,
    options: { readonly cause?: unknown; readonly advice?: string } = {},
  ) {
    super(message, options.cause === undefined ? undefined : { cause: options.cause });
    this.advice = options.advice ?? ERRORS[code].advice;
  }

  get exitCode(): number {
    return EXIT_CODES[ERRORS[this.code].exit].code;
  }
}

/** What was wrong with a certificate, by the codes of Node and OpenSSL. */
const CERTIFICATE_WORDS: Readonly<Record<string, string>> = {
  CERT_HAS_EXPIRED: "the server's certificate has ended",
  CERT_NOT_YET_VALID: "the server's certificate is not valid yet; is this machine's clock right?",
  ERR_TLS_CERT_ALTNAME_INVALID: "the server's certificate is for another host",
  DEPTH_ZERO_SELF_SIGNED_CERT: 'the server vouches for its certificate itself; ca_file may name it',
  SELF_SIGNED_CERT_IN_CHAIN: "the server's certificate is of an authority not in ca_file",
  UNABLE_TO_VERIFY_LEAF_SIGNATURE: "the server's certificate is of an authority not in ca_file",
  UNABLE_TO_GET_ISSUER_CERT: "the server's certificate is of an authority not in ca_file",
  UNABLE_TO_GET_ISSUER_CERT_LOCALLY: "the server's certificate is of an authority not in ca_file",
  CERT_SIGNATURE_FAILURE: "the server's certificate is of an authority not in ca_file",
  ERR_SSL_TLSV13_ALERT_CERTIFICATE_REQUIRED:
    'the server wants a certificate of rockhour: cert_file and key_file',
  ERR_SSL_SSLV3_ALERT_HANDSHAKE_FAILURE:
    'the server refused the TLS handshake; it may want a certificate of rockhour (cert_file, key_file)',
  ERR_SSL_TLSV1_ALERT_DECRYPT_ERROR:
    "the server cannot verify rockhour's certificate (cert_file) by its authorities",
  ERR_SSL_TLSV1_ALERT_UNKNOWN_CA:
    "the server does not believe the authority of rockhour's certificate (cert_file)",
  ERR_SSL_SSLV3_ALERT_CERTIFICATE_EXPIRED: "rockhour's certificate (cert_file) has ended",
  ERR_SSL_TLSV1_ALERT_PROTOCOL_VERSION: 'the server speaks no TLS 1.2 or later',
  ERR_SSL_UNSUPPORTED_PROTOCOL: 'the server speaks no TLS 1.2 or later',
  ERR_SSL_WRONG_VERSION_NUMBER: 'the server does not speak TLS at that port',
  EPROTO: 'the server does not speak TLS as expected at that port',
};

/** What an unknown thrown value says, in one line; of certificates what is wrong with them. */
export function reasonOf(thrown: unknown): string {
  if (thrown instanceof Error) {
    const { code } = thrown as { code?: unknown };
    const words = typeof code === 'string' ? CERTIFICATE_WORDS[code] : undefined;
    if (words !== undefined) return `${words} (${thrown.message})`;
    return thrown.message || thrown.name;
  }
  return String(thrown);
}

/** Failures of the file system in words; the path stands in the message already. */
const FILE_WORDS: Readonly<Record<string, string>> = {
  ENOENT: 'no such file or folder',
  EISDIR: 'it is a folder',
  ENOTDIR: 'a part of its path is a file, not a folder',
  EEXIST: 'there is a file of this name',
  EACCES: 'permission denied',
  EPERM: 'permission denied',
  EROFS: 'the file system is read-only',
  ENOSPC: 'no room on the disk',
};

/** What the file system said of a file, without repeating its path. */
export function fileReasonOf(thrown: unknown): string {
  const { code } = thrown as { code?: unknown };
  return (typeof code === 'string' ? FILE_WORDS[code] : undefined) ?? reasonOf(thrown);
}

/** Credentials by their form: in addresses and queries, in headers, tokens of rockhour itself. */
const CREDENTIALS: readonly (readonly [RegExp, string])[] = [
  // Of bounded length: else a long word would be looked at from each of its letters to its end.
  // A password with / or @ as they are: to the last @ of the word, rather too much than too little.
  [/([a-z][a-z0-9+.-]{0,30}:\/\/)[^\s/@:"']{1,100}:[^\s"']{1,300}@/gi, '$1***@'],
  [/([a-z][a-z0-9+.-]{0,30}:\/\/)[^\s/@]+@/gi, '$1***@'],
  [/([?&](?:p|password|token|secret)=)[^&\s"']+/gi, '$1***'],
  [/\b(Bearer|Basic) +[\w+/=.~-]{8,}/gi, '$1 ***'],
  [/rockhour-[A-Za-z0-9_-]{43}/g, '***'],
];

/** Masks credentials of any of these forms in a text, which may go to a log or a screen. */
export function withoutCredentials(text: string): string {
  return CREDENTIALS.reduce((left, [form, mask]) => left.replace(form, mask), text);
}

/** Without control characters other than line ends: a file must not write on the terminal. */
export function withoutControls(text: string): string {
  return text.replace(/(?!\n)\p{Cc}/gu, ' ');
}

/** The one message a user sees of a failure: no stack, no credentials, no control characters. */
export function explain(thrown: unknown): string {
  const error =
    thrown instanceof RockhourError
      ? thrown
      : new RockhourError('INTERNAL', reasonOf(thrown), { cause: thrown });
  const text = `rockhour: ${error.message}\n${error.advice} [${error.code}]`;
  return withoutControls(withoutCredentials(text));
}

export function exitCodeOf(thrown: unknown): number {
  return thrown instanceof RockhourError ? thrown.exitCode : EXIT_CODES.internal.code;
}
