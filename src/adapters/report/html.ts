import { type Finding, findingsOf, percent } from '../../core/report/findings.js';
import type { ReportData } from '../../core/report/reportData.js';
import { cycleTotals } from '../../core/report/totals.js';
import { escapeText as text } from './escape.js';
import { figures } from './figures.js';
import { STYLE, STYLE_HASH } from './style.js';
import { cycleTable, eventTable, indicatorTable, sensorTable } from './tables.js';

const LEVELS: Readonly<Record<Finding['level'], string>> = {
  act: 'To look at',
  watch: 'To watch',
  note: 'Note',
};

/**
 * The maintenance report as one HTML file that needs nothing from outside: findings first, then what
 * they rest on. A strict policy in its head lets no script run and nothing be fetched.
 */
export function reportHtml(data: ReportData): string {
  const title = `${data.unit_name}, ${day(data.from)} to ${day(data.to)}`;
  return `<!doctype html>
<html lang="en">
<head>
<meta charset="utf-8">
<meta http-equiv="Content-Security-Policy" content="default-src 'none'; style-src '${STYLE_HASH}'">
<meta name="viewport" content="width=device-width, initial-scale=1">
<title>${text(title)}</title>
<style>${STYLE}</style>
</head>
<body>
<header>
<h1>Beds of ${text(data.unit_name)}</h1>
<p>${minute(data.from)} to ${minute(data.to)}, all times UTC. ${text(data.site)}, unit ${text(data.unit)}. <span class="soft">Made ${minute(data.made)} by rockhour ${text(data.version)}.</span></p>
</header>
${keyFigures(data)}
<main>
<h2>Findings</h2>
${findingsOf(data).map(finding).join('\n')}
${figures(data)}
${sections(data)}
</main>
${CAUTION}
</body>
</html>
`;
}

function sections(data: ReportData): string {
  return [
    ['Indicators', indicatorTable(data)],
    ['Thermocouples', sensorTable(data)],
    ['Runs', cycleTable(data)],
    ['Alarms and alerts', eventTable(data)],
  ]
    .map(([title, content]) => `<section><h2>${title}</h2>\n${content}</section>`)
    .join('\n');
}

function keyFigures(data: ReportData): string {
  const totals = cycleTotals(data.cycles);
  const trip =
    totals.round_trip === null
      ? '-'
      : `${percent(totals.round_trip)} <span class="soft">of ${totals.round_trips}</span>`;
  const lost = Object.entries(totals.standing_lost_MWh_th)
    .map(([store, heat]) => `${text(store)} ${heat.toFixed(1)}`)
    .join(', ');
  const boxes: [string, string][] = [
    [`${totals.charges} / ${totals.discharges}`, 'charges / discharges'],
    [`${totals.drawn_MWh_el.toFixed(1)}`, 'MWh_el drawn'],
    [`${totals.delivered_MWh_el.toFixed(1)}`, 'MWh_el delivered'],
    [trip, 'round trip, median of those that closed'],
    [`${totals.standing_h.toFixed(0)} h`, `stood; lost in MWh_th: ${lost || '-'}`],
    [
      String(data.indicators.filter(({ state }) => state === 'degraded').length),
      'indicators degraded',
    ],
  ];
  return `<div class="figures">${boxes.map(([value, words]) => `<div><b>${value}</b>${words}</div>`).join('')}</div>`;
}

function finding({ level, subject, title, text: words, evidence, check }: Finding): string {
  const list =
    evidence.length === 0
      ? ''
      : `<ul>${evidence.map((line) => `<li>${text(line)}</li>`).join('')}</ul>`;
  const site = check === null ? '' : `<p><b>On site:</b> ${text(check)}.</p>`;
  return (
    `<article class="finding ${level}"><h3><span class="level">${LEVELS[level]}:</span> ` +
    `${text(subject)}: ${text(title)}</h3><p>${text(words)}</p>${list}${site}</article>`
  );
}

export function minute(iso: string): string {
  return `${iso.slice(0, 10)} ${iso.slice(11, 16)}`;
}

function day(iso: string): string {
  return iso.slice(0, 10);
}

const CAUTION = `<aside class="caution"><p><b>Before anyone goes near.</b> These are pressure vessels with hot and cryogenic parts, and the gas displaces oxygen: in pits, vessels and closed rooms it kills without warning. Open, enter or loosen nothing on the strength of this report. Isolation, depressurising, gas-free measurement, cooling down or warming up, and work permits follow local codes and belong to licensed people. Causes are probable, not proven. rockhour advises; it trips nothing and protects nothing.</p></aside>`;
