import { createWriteStream, type WriteStream } from 'node:fs';
import { finished } from 'node:stream/promises';
import { fileReasonOf, RockhourError } from '../../errors.js';

/** Resolves when a stream takes more, or will never again. */
function roomIn(stream: WriteStream | NodeJS.WriteStream): Promise<void> {
  return new Promise((resolve) => {
    const done = () => {
      for (const event of ['drain', 'close', 'error']) stream.off(event, done);
      resolve();
    };
    for (const event of ['drain', 'close', 'error']) stream.once(event, done);
  });
}

/**
 * Writes lines of text to a file, or to standard output for `-`, no faster than it takes them. The
 * file is touched only when the first lines go to it, so that a command that fails before leaves
 * an older file as it was.
 */
export class LineWriter {
  lines = 0;
  private stream: WriteStream | NodeJS.WriteStream | null = null;
  private failure: Error | null = null;
  private buffer: string[] = [];
  private buffered = 0;

  constructor(private readonly path: string) {}

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
    const stream = this.open();
    if (stream === process.stdout) return;
    stream.end();
    // Its error is kept by the listener and told here.
    await finished(stream).catch(() => undefined);
    this.check();
  }

  private open(): WriteStream | NodeJS.WriteStream {
    if (this.stream !== null) return this.stream;
    const stream = this.path === '-' ? process.stdout : createWriteStream(this.path);
    stream.on('error', (error: Error) => {
      this.failure ??= error;
    });
    this.stream = stream;
    return stream;
  }

  private async flush(): Promise<void> {
    this.check();
    const text = this.buffer.join('');
    this.buffer = [];
    this.buffered = 0;
    if (text === '') return;
    const stream = this.open();
    if (!stream.write(text)) await roomIn(stream);
    this.check();
  }

  private check(): void {
    if (this.failure === null) return;
    const name = this.path === '-' ? 'standard output' : `the output ${this.path || '""'}`;
    throw new RockhourError(
      'OUTPUT_UNWRITABLE',
      `${name} cannot be written: ${fileReasonOf(this.failure)}`,
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
