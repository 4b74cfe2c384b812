import { model } from '../lib/page.js';
import { hrefOf, route } from '../lib/route.js';
import type { UnitDefinition } from '../lib/wire.js';
import { CyclesPart } from './CyclesPart.js';
import { IndicatorsPart } from './IndicatorsPart.js';
import { PlaybackPart } from './PlaybackPart.js';
import { ReportPart } from './ReportPart.js';
import { SensorsPart } from './SensorsPart.js';
import { StringsPart } from './StringsPart.js';
import { useWatch } from './useWatch.js';
import { Verdict } from './Verdict.js';

const PARTS = {
  indicators: 'Indicators',
  cycles: 'Over weeks',
  playback: 'Playback',
  strings: 'Strings',
  thermocouples: 'Thermocouples',
  report: 'Report',
} as const;
type Part = keyof typeof PARTS;

const partOf = (text: string): Part => {
  const [first = ''] = text.split('/');
  return first in PARTS ? (first as Part) : 'indicators';
};

/** What the maintenance engineer looks at: what has changed first, and below it one part of the proof. */
export function MaintenanceSheet() {
  const { selected, unit } = model;
  if (selected.value === null || unit.value === null) return <h1>Rock</h1>;
  const { definition, name } = unit.value;
  return <Rock key={selected.value} unit={selected.value} name={name} definition={definition} />;
}

function Rock({
  unit,
  name,
  definition,
}: {
  unit: string;
  name: string;
  definition: UnitDefinition | null;
}) {
  const watched = useWatch(unit);
  const part = partOf(route.value.part);
  return (
    <>
      <Verdict unit={unit} name={name} watched={watched} />
      <nav class="rock-parts" aria-label="Parts of this sheet">
        {Object.entries(PARTS).map(([id, words]) => (
          <a key={id} href={hrefOf('rock', id)} aria-current={id === part ? 'true' : undefined}>
            {words}
          </a>
        ))}
      </nav>
      <section id={part} key={part} class="rock-part" tabIndex={-1} aria-label={PARTS[part]}>
        {part === 'indicators' && <IndicatorsPart unit={unit} watched={watched} />}
        {part === 'report' && <ReportPart unit={unit} />}
        {definition !== null && (
          <>
            {part === 'cycles' && <CyclesPart unit={unit} stores={definition.stores} />}
            {part === 'playback' && <PlaybackPart unit={unit} stores={definition.stores} />}
            {part === 'strings' && <StringsPart stores={definition.stores} />}
            {part === 'thermocouples' && <SensorsPart unit={unit} stores={definition.stores} />}
          </>
        )}
      </section>
    </>
  );
}
