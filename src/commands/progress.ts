import cliProgress from 'cli-progress';

export interface Progress {
  update(done: number): void;
  stop(): void;
}

const SILENT: Progress = { update: () => undefined, stop: () => undefined };

/**
 * A bar on standard error, where that is a terminal; elsewhere nothing, as a bar in a log file
 * helps nobody. `total` and `done` in any unit.
 */
export function startProgress(label: string, total: number): Progress {
  if (!process.stderr.isTTY || !(total > 0)) return SILENT;
  const bar = new cliProgress.SingleBar({
    stream: process.stderr,
    // Neither hidden nor unwrapped: after a kill nothing has to be put back.
    hideCursor: false,
    linewrap: true,
    etaBuffer: 100,
    format: (options, params) => {
      const { BarFormat: drawn, TimeFormat: time } = cliProgress.Format;
      const percent = Math.floor(params.progress * 100);
      const elapsed_s = Math.round((Date.now() - params.startTime) / 1000);
      return `${label} ${drawn(params.progress, options)} ${percent} %, ${time(elapsed_s, options, 1)}, ${time(params.eta, options, 1)} to go`;
    },
  });
  bar.start(total, 0);
  return { update: (done) => bar.update(done), stop: () => bar.stop() };
}
