import { findingsOf } from '../../core/report/findings.js';
import type { ReportData } from '../../core/report/reportData.js';
import { reportHtml } from './html.js';
import { type ReportTable, reportCsv } from './reportCsv.js';

export const REPORT_FORMATS = ['html', 'json', 'csv'] as const;
export type ReportFormat = (typeof REPORT_FORMATS)[number];

/** A report as text: the sheet, all of its data with the findings, or one of its tables. */
export function renderReport(
  data: ReportData,
  format: ReportFormat,
  table: ReportTable = 'runs',
): string {
  if (format === 'csv') return reportCsv(data, table);
  if (format === 'json') return `${JSON.stringify({ findings: findingsOf(data), ...data })}\n`;
  return reportHtml(data);
}
