import { RockhourError } from '../errors.js';

const SIGNALS = ['SIGINT', 'SIGTERM'] as const;

/**
 * Lets a command that works something off end in order: asked by a signal, it stops after the piece
 * at hand. A second signal ends the process at once, as without.
 */
export class Interrupt {
  private signal: NodeJS.Signals | null = null;
  private readonly taken = (signal: NodeJS.Signals) => {
    this.signal = signal;
    this.stop();
    this.resolve(signal);
  };
  private resolve: (signal: NodeJS.Signals) => void = () => undefined;
  /** Resolves at the first signal. */
  readonly asked: Promise<NodeJS.Signals> = new Promise((resolve) => {
    this.resolve = resolve;
  });

  start(): void {
    for (const signal of SIGNALS) process.on(signal, this.taken);
  }

  stop(): void {
    for (const signal of SIGNALS) process.off(signal, this.taken);
  }

  /** @throws RockhourError INTERRUPTED once a signal has come; `done` says how far it got */
  check(done: () => string): void {
    if (this.signal !== null) throw interrupted(this.signal, done());
  }
}

export function interrupted(signal: NodeJS.Signals, done: string): RockhourError {
  return new RockhourError('INTERRUPTED', `stopped by ${signal} ${done}`);
}
