import { useState } from 'preact/hooks';
import type { AnswerFault } from '../lib/api.js';
import { fixed, MODE_WORDS, power } from '../lib/format.js';
import { model } from '../lib/page.js';
import { Choices } from '../parts/Choices.js';
import { DayAndTime } from './DayAndTime.js';
import { sourceNow } from './moved.js';
import {
  BlockTable,
  Nearest,
  ScheduleFacts,
  ScheduleVerdict,
  scheduleRows,
} from './ScheduleAnswer.js';
import { SchedulePicture } from './SchedulePicture.js';
import { Scrolled } from './Scrolled.js';
import { Awaited, StandsOn } from './Standing.js';
import { beyondLimits, inZone } from './scheduleLimits.js';
import {
  askedLines,
  askedText,
  checkSchedule,
  scheduleAsking,
  scheduleCertainty,
  scheduleText,
} from './scheduleState.js';
import {
  asText,
  hasOffset,
  hoursOf,
  type LineFault,
  readSchedule,
  type TypedSchedule,
} from './scheduleText.js';
import { csvOf, Take, tabsOf } from './Take.js';
import { typedTime, wallOf, zoneWords } from './times.js';
import { type PlannedBlock, zoneOf } from './wire.js';
import { CERTAINTIES, oddsOf } from './words.js';

const EXAMPLE = '18:00, 20:00, 1.8\n20:00, 21:00, 0.9\n22:00, 04:00, -2.4';
const MOST_SHOWN = 12;

/** Whether a schedule holds: typed or pasted, read as it is typed, checked when asked. */
export function SchedulePart() {
  const [tried, setTried] = useState(false);
  const entry = model.unit.value;
  if (entry === null) return null;
  const { unit } = entry;
  const zone = zoneOf(entry);
  const now_ms = sourceNow(entry, 0) ?? Date.now();
  const here = wallOf(zone, now_ms);
  const text = scheduleText.value;
  const read = readSchedule(text, here.date, here.clock);
  const estimate_ms = Date.parse(entry.state?.estimate?.time ?? '') || now_ms;
  const faults = [...read.faults, ...beyondLimits(read.blocks, zone, now_ms, estimate_ms)];
  const typed = { blocks: read.blocks, faults };
  const told = scheduleAsking.of(unit);
  // What was refused is no word on rows that are read anew.
  const refused = told.faults.length > 0 && askedText.value === text;
  const asked =
    told.faults.length === 0
      ? told
      : { ...told, fault: refused ? 'The schedule was refused; see its rows.' : null };
  const { answer: check } = asked;
  const checkNow = () => {
    setTried(true);
    if (typed.faults.length > 0 || typed.blocks.length === 0) return;
    checkSchedule({ unit, zone }, typed.blocks, text);
  };
  const use = () => {
    if (check?.nearest == null) return;
    const again = asText(writtenAgain(zone, check.nearest.blocks));
    scheduleText.value = again;
    checkSchedule({ unit, zone }, readSchedule(again, here.date, here.clock).blocks, again);
  };
  const old = check !== null && check.text !== text;
  return (
    <>
      <div class="typing">
        <form
          onSubmit={(event) => {
            event.preventDefault();
            checkNow();
          }}
        >
          <label class="field wide">
            <span>Blocks, one a row: from, to, MW electric (above 0 delivers, below 0 draws)</span>
            <textarea
              name="schedule"
              rows={6}
              spellcheck={false}
              value={text}
              placeholder={EXAMPLE}
              aria-describedby="schedule-help schedule-faults"
              aria-invalid={tried && typed.faults.length > 0 ? 'true' : undefined}
              onInput={(event) => {
                scheduleText.value = event.currentTarget.value;
              }}
            />
          </label>
          <p id="schedule-help" class="help">
            Type, or paste from a spreadsheet; decimal point or comma; with or without a header; a
            time of day alone follows the row before. Times are those of {zoneWords(zone)}. Between
            blocks the unit stands.
          </p>
          <Choices
            legend="It is to hold"
            name="schedule-certainty"
            options={CERTAINTIES.map((value) => ({ value: String(value), label: oddsOf(value) }))}
            chosen={String(scheduleCertainty.value)}
            onChoose={(value) => {
              scheduleCertainty.value = Number(value);
            }}
          />
          <p>
            <button type="submit" class="main">
              {asked.since_ms === null ? 'Check' : 'Check this instead'}
            </button>{' '}
            {text === '' && (
              <button
                type="button"
                onClick={() => {
                  scheduleText.value = EXAMPLE;
                }}
              >
                Write an example
              </button>
            )}
          </p>
        </form>
        <Preview
          typed={typed}
          faults={[...typed.faults, ...(refused ? serverFaults(told.faults) : [])]}
          zone={zone}
          tried={tried}
          empty={text.trim() === ''}
        />
      </div>
      <Awaited
        asked={asked}
        usual="1 to 5 s, longer for many blocks"
        onCancel={() => scheduleAsking.cancel()}
      />
      {check !== null && (
        <div aria-busy={asked.since_ms !== null}>
          <StandsOn asked={asked} onAsk={checkNow} />
          {old && (
            <p class="moved" role="status">
              ▲ What is typed has changed since; this answers the schedule of before.
            </p>
          )}
          <div class="schedule-view">
            <ScheduleVerdict check={check} />
            <SchedulePicture {...{ check, zone }} />
            <ScheduleFacts {...{ check, zone }} />
            <Nearest {...{ check, zone }} onUse={use} />
            <BlockTable {...{ check, zone }} />
          </div>
          <Take
            name={`${unit}-schedule.csv`}
            csv={() => csvOf(scheduleRows(check))}
            text={() => tabsOf(scheduleRows(check))}
          />
        </div>
      )}
    </>
  );
}

/** Blocks with local times, as people write them; with offsets where clocks change or seconds count. */
function writtenAgain(zone: string | null, blocks: readonly PlannedBlock[]): PlannedBlock[] {
  const times = blocks.flatMap(({ from, to }) => [from, to]);
  const plain =
    times.every((time) => Date.parse(time) % 60_000 === 0) &&
    new Set(times.map((time) => time.slice(19))).size === 1;
  if (!plain) return [...blocks];
  return blocks.map((block) => ({
    ...block,
    from: typedTime(zone, block.from),
    to: typedTime(zone, block.to),
  }));
}

/** Faults that the server found, by the line of the row they are in. */
function serverFaults(faults: readonly AnswerFault[]): LineFault[] {
  return faults.map(({ field, value, expected }) => {
    const [, index, name = ''] = /^blocks\.(\d+)(?:\.(.+))?$/.exec(field) ?? [];
    const line = index === undefined ? 0 : (askedLines.value[Number(index)] ?? 0);
    const what = index === undefined ? field : name.replace('power_MW_el', 'power');
    return { line, words: `${what} is ${String(value ?? 'missing')}; expected ${expected}` };
  });
}

/** The rows as they were understood, and what was not. */
function Preview({
  typed,
  zone,
  faults,
  tried,
  empty,
}: {
  typed: TypedSchedule;
  zone: string | null;
  faults: readonly LineFault[];
  tried: boolean;
  empty: boolean;
}) {
  const { blocks } = typed;
  const converted = blocks.some(({ from, to }) => hasOffset(from) || hasOffset(to));
  return (
    <div class="preview">
      <ul id="schedule-faults" class="line-faults" aria-live="polite">
        {faults.map(({ line, words }) => (
          <li key={`${line}${words}`}>
            <b>▲ {line > 0 ? `Line ${line}` : 'All'}:</b> {words}
          </li>
        ))}
        {tried && empty && (
          <li>
            <b>▲</b> There is nothing to check yet: a row is, for example, 18:00, 20:00, 1.8
          </li>
        )}
      </ul>
      {blocks.length > 0 && (
        <Scrolled label="Blocks as they are read">
          <table class="plain">
            <caption>
              As it is read: {blocks.length} {blocks.length === 1 ? 'block' : 'blocks'}; times of{' '}
              {zoneWords(zone)}
              {converted && ', those typed with an offset or Z too'}
            </caption>
            <thead>
              <tr>
                <th scope="col">line</th>
                <th scope="col">from</th>
                <th scope="col">to</th>
                <th scope="col">mode</th>
                <th scope="col">
                  MW<sub>el</sub>
                </th>
                <th scope="col">
                  MWh<sub>el</sub>
                </th>
              </tr>
            </thead>
            <tbody>
              {blocks.slice(0, MOST_SHOWN).map((block) => {
                const hours = hoursOf(block);
                return (
                  <tr key={block.line}>
                    <td>{block.line}</td>
                    <td>
                      <DayAndTime text={inZone(zone, block.from)} />
                    </td>
                    <td>
                      <DayAndTime text={inZone(zone, block.to)} />
                    </td>
                    <td>{MODE_WORDS[block.mode]}</td>
                    <td>{power(block.power_MW_el)}</td>
                    <td>{hours === null ? '–' : fixed(hours * block.power_MW_el, 2)}</td>
                  </tr>
                );
              })}
            </tbody>
          </table>
        </Scrolled>
      )}
      {blocks.length > MOST_SHOWN && <p>and {blocks.length - MOST_SHOWN} more</p>}
    </div>
  );
}
