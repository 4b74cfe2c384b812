import type { ChildProcess } from 'node:child_process';
import { startRockhour } from '../../test/support/cli.js';
import { waitFor } from '../../test/support/wait.js';

const START_MS = 120_000;

/** The daemon as a process of its own, started again as often as it takes. */
export class ChaosDaemon {
  private child: ChildProcess | null = null;
  private said = '';
  private out = '';

  constructor(
    private readonly config: string,
    private readonly env: Readonly<Record<string, string>> = {},
  ) {}

  get pid(): number {
    return this.child?.pid ?? 0;
  }

  /** The end of its log. */
  get log(): string {
    return this.said;
  }

  /** Address of page and API, once it is ready. */
  get url(): string {
    return / page=(\S+)/.exec(this.out)?.[1] ?? '';
  }

  spawn(): void {
    const child = startRockhour(['run', '--config', this.config], this.env);
    this.child = child;
    this.out = '';
    child.stdout?.on('data', (chunk: Buffer) => {
      this.out += chunk.toString();
    });
    child.stderr?.on('data', (chunk: Buffer) => {
      this.said = (this.said + chunk.toString()).slice(-20_000);
    });
  }

  async ready(): Promise<void> {
    const what = 'the ready line of the daemon';
    await waitFor(what, () => this.hasEnded() || this.out.includes('ready '), START_MS);
    if (this.hasEnded()) throw new Error(`the daemon ended at its start: ${this.said}`);
  }

  async start(): Promise<void> {
    this.spawn();
    await this.ready();
  }

  async end(signal: NodeJS.Signals): Promise<void> {
    const { child } = this;
    this.child = null;
    if (!child || child.exitCode !== null || child.signalCode !== null) return;
    const ended = new Promise((resolve) => child.once('close', resolve));
    child.kill(signal);
    await ended;
  }

  private hasEnded(): boolean {
    return this.child === null || this.child.exitCode !== null || this.child.signalCode !== null;
  }
}
