import type { ChildProcess } from 'node:child_process';
import { startRockhour } from '../support/cli.js';
import { waitFor } from '../support/wait.js';
import { later } from './harness.js';

/** A `rockhour` process of a test, with what it has said so far. */
export class RockhourProcess {
  stdout = '';
  stderr = '';
  private readonly child: ChildProcess;
  private readonly exit: Promise<number | null>;

  /**
   * @param outlives true: it lives on after the test at hand, and whoever started it ends it
   * @param through a program and its arguments that run it, such as strace
   */
  constructor(args: readonly string[], outlives = false, through: readonly string[] = []) {
    this.child = startRockhour(args, {}, through);
    this.child.stdout?.on('data', (chunk: Buffer) => {
      this.stdout += chunk.toString();
    });
    this.child.stderr?.on('data', (chunk: Buffer) => {
      this.stderr += chunk.toString();
    });
    this.exit = new Promise((resolve) => this.child.once('close', resolve));
    if (!outlives) later(() => this.end('SIGKILL'));
  }

  /** The ready line, once it is there. */
  ready(): Promise<string> {
    return waitFor(
      `the ready line; said: ${this.stderr}`,
      () => {
        if (this.child.exitCode !== null) throw new Error(`it ended: ${this.stderr}`);
        return this.stdout.split('\n').find((line) => line.startsWith('ready '));
      },
      60_000,
    );
  }

  signal(signal: NodeJS.Signals): void {
    this.child.kill(signal);
  }

  /** Sends a signal and gives the exit code. */
  async end(signal: NodeJS.Signals): Promise<number | null> {
    this.child.kill(signal);
    return this.exit;
  }

  ended(): Promise<number | null> {
    return this.exit;
  }
}
