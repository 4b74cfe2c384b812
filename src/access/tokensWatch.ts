import { readFileSync, statSync } from 'node:fs';
import type { Access } from './access.js';
import { type AccessToken, repeatedToken } from './token.js';
import { readTokens } from './tokensFile.js';

export interface TokensWatchOptions {
  readonly access: Access;
  readonly file: string;
  /** Tokens of the configuration itself, which stay. */
  readonly inline: readonly AccessToken[];
  readonly every_ms?: number;
  info(text: string): void;
  error(text: string): void;
}

const EVERY_MS = 2000;

/**
 * Takes over what changes in a tokens file: a token that is taken out of it is refused within
 * seconds. A file with a fault, or none, changes nothing: it is told, and those before go on.
 */
export class TokensWatch {
  private timer: NodeJS.Timeout | null = null;
  private stamp = '';

  constructor(private readonly options: TokensWatchOptions) {}

  start(): void {
    this.stamp = stampOf(this.options.file);
    this.timer ??= setInterval(() => this.look(), this.options.every_ms ?? EVERY_MS);
  }

  stop(): void {
    if (this.timer) clearInterval(this.timer);
    this.timer = null;
  }

  private look(): void {
    const { access, file, inline, info, error } = this.options;
    const stamp = stampOf(file);
    if (stamp === this.stamp) return;
    this.stamp = stamp;
    const refuse = (fault: string) =>
      error(`http.tokens_file ${file}: ${fault}; the tokens of before go on`);
    let text: string;
    try {
      text = readFileSync(file, 'utf8');
    } catch {
      refuse('cannot be read');
      return;
    }
    const read = readTokens(text);
    if ('fault' in read) {
      refuse(read.fault);
      return;
    }
    const tokens = [...inline, ...read];
    const twice = repeatedToken(tokens);
    if (twice !== null) {
      refuse(`a ${twice.what} that http.tokens has as well`);
      return;
    }
    access.replace(tokens);
    info(`http.tokens_file: ${read.length} tokens taken over`);
  }
}

function stampOf(file: string): string {
  const found = statSync(file, { throwIfNoEntry: false });
  return found === undefined ? 'gone' : `${found.mtimeMs} ${found.size} ${found.ino}`;
}
