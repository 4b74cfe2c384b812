import { useState } from 'preact/hooks';
import { fixed, hoursText, percent, power } from '../lib/format.js';
import { api, model } from '../lib/page.js';
import { hrefOf, route } from '../lib/route.js';
import { useAnswer } from '../lib/useAnswer.js';
import { Choices } from '../parts/Choices.js';
import { Unit } from '../parts/Unit.js';
import { DayAndTime } from './DayAndTime.js';
import { KeptTable } from './KeptTable.js';
import { sourceNow } from './moved.js';
import { DeliveredPicture, SharePicture } from './PromisePictures.js';
import { Scrolled } from './Scrolled.js';
import { csvOf, Take, tabsOf } from './Take.js';
import { typedTime, zoneWords } from './times.js';
import {
  type KeptShare,
  type KeptTables,
  type OfferHead,
  type OfferReport,
  zoneOf,
} from './wire.js';
import { causeWords, UNTESTED_WORDS } from './words.js';

const SPANS = [
  { value: '7', label: '7 days' },
  { value: '30', label: '30 days' },
  { value: '365', label: 'a year' },
];
const DAY_MS = 86_400_000;

/** What became of what was promised: kept tables against what was then delivered. */
export function PromisesPart() {
  const [days, setDays] = useState('30');
  const [round, setRound] = useState(0);
  const entry = model.unit.value;
  const unit = entry?.unit ?? '';
  const now_ms = entry === null ? null : sourceNow(entry, 0);
  const no = route.value.part.split('/')[1];
  const opened = no !== undefined && /^\d+$/.test(no) ? Number(no) : null;
  const key = entry === null || now_ms === null ? null : `${unit}|${days}|${round}`;
  const found = useAnswer<{ report: OfferReport; history: KeptTables }>(key, async (ended) => {
    const to_ms = Math.ceil((sourceNow(entry!, 0) ?? Date.now()) + 60_000);
    const query = {
      from: new Date(to_ms - Number(days) * DAY_MS).toISOString(),
      to: new Date(to_ms).toISOString(),
    };
    const path = (name: string) => api.path(unit, 'offers', name);
    const [report, history] = await Promise.all([
      api.ahead<OfferReport>(path('report'), { query }, ended),
      api.get<KeptTables>(path('history'), query, ended),
    ]);
    return { report, history };
  });
  if (entry === null) return null;
  if (opened !== null) return <KeptTable unit={unit} no={opened} />;
  const zone = zoneOf(entry);
  const { answer } = found;
  return (
    <>
      <div class="over">
        <Choices
          legend="Promises of the last"
          name="promise-span"
          options={SPANS}
          chosen={days}
          onChoose={setDays}
        />
        <button type="button" onClick={() => setRound(round + 1)} disabled={found.asking}>
          Ask again
        </button>
        <p role="status">{found.asking ? 'Being looked up …' : ''}</p>
      </div>
      <p class="fault" role="alert">
        {found.fault ?? ''}
      </p>
      {answer !== null && (
        <>
          {answer.report.tables > 0 && <Kept report={answer.report} zone={zone} />}
          <History history={answer.history} zone={zone} />
          {answer.report.tables > 0 && <p class="help">Times are those of {zoneWords(zone)}.</p>}
          {answer.report.tested.length > 0 && (
            <Take
              name={`${unit}-promises.csv`}
              csv={() => csvOf(reportRows(answer.report))}
              text={() => tabsOf(reportRows(answer.report))}
            />
          )}
        </>
      )}
    </>
  );
}

/** Whether a figure is kept as often as was meant, as far as the count tells. */
export function shareWords({ kept, of, meant, interval }: KeptShare): {
  words: string;
  care: boolean;
} {
  if (of === 0 || interval === null) return { words: 'not put to the test yet', care: false };
  const short = `${of - kept} of ${of} short; meant ${fixed((1 - meant) * of, 1)}`;
  if (interval[1] < meant) return { words: `${short}: short more often than was said`, care: true };
  if (interval[0] > meant) return { words: `${short}: more careful than was said`, care: false };
  return { words: `${short}: in keeping with what was said`, care: false };
}

function Kept({ report, zone }: { report: OfferReport; zone: string | null }) {
  const { tested } = report;
  const hopeful = tested.filter(
    ({ delivered_MWh_el, energy_MWh_el }) => delivered_MWh_el >= energy_MWh_el.p10,
  ).length;
  const firm = shareWords(report.p90);
  const even = shareWords(report.p50);
  const untested = Object.entries(report.untested).filter(([, count]) => count > 0);
  return (
    <>
      <div class="promise-view">
        <div class="closely">
          {report.p90.of === 0 ? (
            <p class="lead">
              No discharge of that time has put a promise to the test yet, so that nothing can be
              said of how they were kept.
            </p>
          ) : (
            <p class="large">
              <strong data-field="firm-kept">{`${report.p90.kept} of ${report.p90.of}`}</strong>
              <span>discharges gave at least the firm figure (p90, nine in ten)</span>
            </p>
          )}
          <dl class="facts">
            {tested.length > 0 && (
              <>
                <dt>Firm (p90)</dt>
                <dd class={firm.care ? 'care' : undefined} data-field="firm-words">
                  {firm.care && '▲ '}
                  {firm.words}
                </dd>
                <dt>Even (p50)</dt>
                <dd class={even.care ? 'care' : undefined}>
                  {even.care && '▲ '}
                  {even.words}
                </dd>
                <dt>Hopeful (p10)</dt>
                <dd>
                  {`reached ${hopeful} of ${tested.length} times; meant ${fixed(tested.length / 10, 1)}`}
                </dd>
              </>
            )}
            <dt>Looked at</dt>
            <dd>
              {report.tables} kept {report.tables === 1 ? 'table' : 'tables'}
              {report.older_left_out && '; there are more in that time'}
            </dd>
          </dl>
          {untested.length > 0 && (
            <details>
              <summary>Offers that were not put to the test, and why</summary>
              <ul class="reasons">
                {untested.map(([why, count]) => (
                  <li key={why}>
                    <b>{count}</b> {UNTESTED_WORDS[why as keyof typeof UNTESTED_WORDS]}
                  </li>
                ))}
              </ul>
              <p class="help">{report.tested_by}</p>
            </details>
          )}
        </div>
        {tested.length > 0 && (
          <SharePicture
            rows={[
              { name: 'firm (p90)', kept: report.p90 },
              { name: 'even (p50)', kept: report.p50 },
            ]}
          />
        )}
        {tested.length > 0 && <DeliveredPicture {...{ tested, zone }} />}
      </div>
      {tested.length > 0 && <Tested {...{ report, zone }} />}
    </>
  );
}

function Tested({ report, zone }: { report: OfferReport; zone: string | null }) {
  const newest = [...report.tested].sort((a, b) => b.begins.localeCompare(a.begins));
  return (
    <details class="long" open={newest.length <= 12}>
      <summary>Each discharge that put a promise to the test</summary>
      <Scrolled label="Promises put to the test">
        <table class="plain tight">
          <thead>
            <tr>
              <th scope="col">began</th>
              <th scope="col">
                MW<sub>el</sub>
              </th>
              <th scope="col">
                firm, MWh<sub>el</sub>
              </th>
              <th scope="col">even</th>
              <th scope="col">hopeful</th>
              <th scope="col">given</th>
              <th scope="col">of firm</th>
              <th scope="col">kept</th>
              <th scope="col">ended by</th>
              <th scope="col">table</th>
            </tr>
          </thead>
          <tbody>
            {newest.map((one) => (
              <tr key={`${one.no}${one.begins}`} data-short={one.kept.p90 ? undefined : ''}>
                <th scope="row">{typedTime(zone, one.begins)}</th>
                <td>{power(one.power_MW_el)}</td>
                <td>
                  <strong>{fixed(one.energy_MWh_el.p90, 2)}</strong>
                </td>
                <td>{fixed(one.energy_MWh_el.p50, 2)}</td>
                <td>{fixed(one.energy_MWh_el.p10, 2)}</td>
                <td>{fixed(one.delivered_MWh_el, 2)}</td>
                <td>{percent(one.delivered_MWh_el / one.energy_MWh_el.p90, 0)} %</td>
                <td>{one.kept.p90 ? 'firm' : <span class="care">▼ short</span>}</td>
                <td>{causeWords(one.ended_by)}</td>
                <td>
                  <TableLink no={one.no} />
                </td>
              </tr>
            ))}
          </tbody>
        </table>
      </Scrolled>
    </details>
  );
}

function TableLink({ no }: { no: number }) {
  return (
    <a href={hrefOf('offer', `promises/${no}`)} aria-label={`Open kept table ${no}`}>
      no. {no}
    </a>
  );
}

function History({ history, zone }: { history: KeptTables; zone: string | null }) {
  const { tables, older_left_out } = history;
  if (tables.length === 0) {
    return (
      <p>
        No table was kept in that time. Keep one under{' '}
        <a href={hrefOf('offer', 'table')}>What can be sold</a>, and it is held here against what
        the unit then delivers.
      </p>
    );
  }
  return (
    <Scrolled label="Kept tables">
      <table class="plain">
        <caption>
          Kept tables, newest first{older_left_out && '; the newest 100, there are more'}; firm
          (p90) figures in MWh
          <sub>el</sub> from the first start
        </caption>
        <thead>
          <tr>
            <th scope="col">table</th>
            <th scope="col">asked</th>
            <th scope="col">first start</th>
            <th scope="col">offers</th>
          </tr>
        </thead>
        <tbody>
          {tables.map(({ no, asked, offers }) => {
            const start = offers[0]?.start;
            return (
              <tr key={no}>
                <th scope="row">
                  <TableLink no={no} />
                </th>
                <td>
                  <DayAndTime text={typedTime(zone, asked)} />
                </td>
                <td>{start === undefined ? '–' : <DayAndTime text={typedTime(zone, start)} />}</td>
                <td>
                  {offers
                    .filter((offer) => offer.start === start)
                    .slice(0, 3)
                    .map((offer) => (
                      <OfferLine key={offer.power_MW_el} offer={offer} />
                    ))}
                </td>
              </tr>
            );
          })}
        </tbody>
      </table>
    </Scrolled>
  );
}

/** An offer in one line, for a table of the past. */
function OfferLine({ offer }: { offer: OfferHead }) {
  const { power_MW_el, hours, energy_MWh_el, refused } = offer;
  if (refused !== null) {
    return (
      <span class="line">
        {power(power_MW_el)}
        <Unit name="MW_el" />: refused
      </span>
    );
  }
  return (
    <span class="line">
      {power(power_MW_el)}
      <Unit name="MW_el" />: {fixed(energy_MWh_el.p90, 2)}
      <Unit name="MWh_el" />, <span class="whole">{hoursText(hours.p90)}</span>
    </span>
  );
}

function reportRows(report: OfferReport): (string | number | boolean)[][] {
  return [
    [
      ...['table', 'asked', 'begins', 'power_MW_el', 'p90_MWh_el', 'p50_MWh_el', 'p10_MWh_el'],
      ...['delivered_MWh_el', 'kept_p90', 'kept_p50', 'ended_by'],
    ],
    ...report.tested.map((one) => [
      one.no,
      one.asked,
      one.begins,
      one.power_MW_el,
      one.energy_MWh_el.p90,
      one.energy_MWh_el.p50,
      one.energy_MWh_el.p10,
      one.delivered_MWh_el,
      one.kept.p90,
      one.kept.p50,
      one.ended_by,
    ]),
  ];
}
