import { statSync } from 'node:fs';
import { readFile } from 'node:fs/promises';
import { reasonOf } from '../errors.js';

export interface CertificateWatchOptions {
  /** Key of the configuration that names the files. */
  readonly path: string;
  readonly cert_file: string;
  readonly key_file: string;
  readonly every_ms: number;
  /** Takes over what the files hold now. @throws Error where they do not fit */
  take(cert: Buffer, key: Buffer): void;
  info(text: string): void;
  error(text: string): void;
}

/** Looks at the files of a certificate from time to time and takes over what is new in them. */
export class CertificateWatch {
  private timer: NodeJS.Timeout | null = null;
  private stamp: string;

  constructor(private readonly options: CertificateWatchOptions) {
    this.stamp = this.stampNow();
  }

  start(): void {
    this.timer ??= setInterval(() => void this.look(), this.options.every_ms);
    this.timer.unref();
  }

  stop(): void {
    if (this.timer !== null) clearInterval(this.timer);
    this.timer = null;
  }

  private async look(): Promise<void> {
    const { path, cert_file, key_file, take, info, error } = this.options;
    const stamp = this.stampNow();
    if (stamp === this.stamp) return;
    this.stamp = stamp;
    try {
      const [cert, key] = await Promise.all([readFile(cert_file), readFile(key_file)]);
      take(cert, key);
      info(`${path}: takes over the new certificate`);
    } catch (thrown) {
      // As long as one of the two files is the old one, they do not fit; the next look tells more.
      error(
        `${path}: goes on with the certificate before; ${cert_file} and ${key_file} cannot be used: ${reasonOf(thrown)}`,
      );
    }
  }

  private stampNow(): string {
    return [this.options.cert_file, this.options.key_file].map(stampOf).join();
  }
}

function stampOf(file: string): string {
  const found = statSync(file, { throwIfNoEntry: false });
  return found === undefined ? 'gone' : `${found.mtimeMs} ${found.size} ${found.ino}`;
}
