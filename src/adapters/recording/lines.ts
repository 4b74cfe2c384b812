import { once } from 'node:events';
import { createWriteStream, type WriteStream } from 'node:fs';
import { finished } from 'node:stream/promises';
import { RockhourError, reasonOf } from '../../errors.js';

/** Writes lines of text to a file, or to standard output for `-`, no faster than it takes them. */
export class LineWriter {
  lines = 0;
  private readonly stream: WriteStream | NodeJS.WriteStream;
  private failure: Error | null = null;
  private buffer: string[] = [];
  private buffered = 0;

  constructor(private readonly path: string) {
    this.stream = path === '-' ? process.stdout : createWriteStream(path);
    this.stream.on('error', (error: Error) => {
      this.failure ??= error;
    });
  }

  /** Takes one line, without its line end. */
  async write(line: string): Promise<void> {
    this.buffer.push(line, '\n');
    this.buffered += line.length + 1;
    this.lines++;
    if (this.buffered > 64 * 1024) await this.flush();
  }

  /** Hands everything over and closes the file; the lines are in it when this resolves. */
  async close(): Promise<void> {
    await this.flush();
    if (this.stream === process.stdout) return;
    this.stream.end();
    // Its error is kept by the listener above and told here.
    await finished(this.stream).catch(() => undefined);
    this.check();
  }

  private async flush(): Promise<void> {
    this.check();
    const text = this.buffer.join('');
    this.buffer = [];
    this.buffered = 0;
    if (text !== '' && !this.stream.write(text)) {
      await Promise.race([once(this.stream, 'drain'), once(this.stream, 'close')]).catch(
        () => undefined,
      );
    }
    this.check();
  }

  private check(): void {
    if (this.failure === null) return;
    const name = this.path === '-' ? 'standard output' : this.path;
    throw new RockhourError(
      'OUTPUT_UNWRITABLE',
      `${name} cannot be written: ${reasonOf(this.failure)}`,
      { cause: this.failure },
    );
  }
}

/** JSON Lines: one value a line. */
export class JsonLinesWriter extends LineWriter {
  writeValue(value: unknown): Promise<void> {
    return this.write(JSON.stringify(value));
  }
}
