import { Worker } from 'node:worker_threads';
import type { SiteSource } from '../config/load.js';
import { RockhourError } from '../errors.js';
import type { Answer, NumberedQuestion, WorkerQuestion, WorkerReply } from '../worker.js';

/** Questions that wait at most; more are refused at once rather than answered too late. */
const MOST_WAITING = 64;

interface Waiting {
  readonly resolve: (answer: Answer) => void;
  readonly reject: (reason: unknown) => void;
}

/** Questions to one worker thread, which is started with the first and again should it end. */
export class WorkerLine {
  private worker: Worker | null = null;
  private readonly waiting = new Map<number, Waiting>();
  private next = 1;

  constructor(private readonly source: SiteSource) {}

  async ask(question: WorkerQuestion): Promise<Answer> {
    if (this.waiting.size >= MOST_WAITING) {
      throw new RockhourError('INTERNAL', `${MOST_WAITING} questions wait for an answer already`, {
        advice: 'Ask again in a moment.',
      });
    }
    const id = this.next++;
    const worker = this.start();
    return new Promise((resolve, reject) => {
      this.waiting.set(id, { resolve, reject });
      worker.postMessage({ id, question } satisfies NumberedQuestion);
    });
  }

  async stop(): Promise<void> {
    const { worker } = this;
    this.worker = null;
    await worker?.terminate();
    this.failAll(new Error('rockhour is stopping'));
  }

  private start(): Worker {
    if (this.worker) return this.worker;
    const worker = startWorker(this.source);
    worker.on('message', (reply: WorkerReply) => this.settle(reply));
    worker.on('error', (error) => this.lost(worker, error));
    worker.on('exit', (code) => this.lost(worker, new Error(`the worker ended with code ${code}`)));
    worker.unref();
    this.worker = worker;
    return worker;
  }

  private settle({ id, answer, failure, code }: WorkerReply): void {
    const waiting = this.waiting.get(id);
    this.waiting.delete(id);
    if (failure === undefined) waiting?.resolve(answer ?? null);
    else waiting?.reject(Object.assign(new Error(failure), code === undefined ? {} : { code }));
  }

  private lost(worker: Worker, reason: Error): void {
    if (this.worker !== worker) return;
    this.worker = null;
    this.failAll(reason);
  }

  private failAll(reason: Error): void {
    for (const { reject } of this.waiting.values()) reject(reason);
    this.waiting.clear();
  }
}

/** From the sources, as in development, the worker needs the loader for TypeScript first. */
function startWorker(workerData: SiteSource): Worker {
  if (!import.meta.url.endsWith('.ts')) {
    return new Worker(new URL('../worker.js', import.meta.url), { workerData });
  }
  const { href } = new URL('../worker.ts', import.meta.url);
  const load = `import('tsx/esm/api').then(({ register }) => { register(); return import('${href}'); })`;
  return new Worker(load, { eval: true, workerData });
}
