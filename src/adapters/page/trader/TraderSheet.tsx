import { hrefOf, route } from '../lib/route.js';
import { ChargePart } from './ChargePart.js';
import { PromisesPart } from './PromisesPart.js';
import { SchedulePart } from './SchedulePart.js';
import { TablePart } from './TablePart.js';

const PARTS = {
  table: { name: 'What can be sold', title: 'What can be sold', Part: TablePart },
  schedule: { name: 'Schedule', title: 'Does a schedule hold?', Part: SchedulePart },
  promises: { name: 'Promises', title: 'What became of promises', Part: PromisesPart },
  charge: { name: 'Charging', title: 'What can still be charged', Part: ChargePart },
} as const;
type PartName = keyof typeof PARTS;

/** The sheet of who sells: one part at a time, since each asks something of the plant's computer. */
export function TraderSheet() {
  const wanted = route.value.part.split('/')[0] ?? '';
  const shown: PartName = wanted in PARTS ? (wanted as PartName) : 'table';
  const { title, Part } = PARTS[shown];
  return (
    <div class="offer-sheet">
      <nav aria-label="Parts of this sheet">
        {Object.entries(PARTS).map(([part, { name }]) => (
          <a
            key={part}
            href={hrefOf('offer', part)}
            aria-current={part === shown ? 'page' : undefined}
          >
            {name}
          </a>
        ))}
      </nav>
      <section id={shown} tabIndex={-1} aria-labelledby="part-title">
        <h1 id="part-title">{title}</h1>
        <Part />
      </section>
    </div>
  );
}
