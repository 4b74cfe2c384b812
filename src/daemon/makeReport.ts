import { join } from 'node:path';
import { History } from '../adapters/history/history.js';
import { gatherReport, thinning } from '../adapters/history/reportReader.js';
import type { ReportQuestion } from '../adapters/http/service.js';
import { renderReport } from '../adapters/report/render.js';
import { STYLE_HASH } from '../adapters/report/style.js';
import type { StoreConfig } from '../config/site.js';
import type { UnitDefinition } from '../core/definitions.js';

/** A report with all that it takes, as it may be sent to a worker. */
export interface MadeReportAsk extends ReportQuestion {
  readonly site: string;
  readonly version: string;
  /** When it is made [ms since 1970]. */
  readonly made_ms: number;
  /** Where the history is: that of the daemon, which may not be the one of the file. */
  readonly store: StoreConfig;
}

export interface MadeReport {
  readonly text: string;
  readonly style: string;
}

/** Makes a report from the local store, opened to read alone. It takes seconds for a month. */
export function makeReport(unit: UnitDefinition, ask: MadeReportAsk): MadeReport {
  const { store, format, table, ...rest } = ask;
  const history = new History(join(store.folder, 'history.sqlite'), store);
  history.startToRead();
  try {
    const data = gatherReport(history, unit, {
      ...rest,
      ...thinning(store, ask.made_ms),
      profiles_at_ms: [],
    });
    return { text: renderReport(data, format, table), style: STYLE_HASH };
  } finally {
    history.stop();
  }
}
