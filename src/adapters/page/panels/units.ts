import { byId, h, setAttributes, setText } from '../lib/dom.js';
import type { PageModel } from '../lib/model.js';
import { isOpen } from './alarms.js';

/** One button per unit, with what stands unacknowledged there and whether its data are stale. */
export function unitsPanel(model: PageModel, onSelect: (unit: string) => void): () => void {
  const root = byId('units');
  const site = byId('site');
  const buttons = new Map<string, { button: HTMLButtonElement; note: HTMLElement }>();

  function build(): void {
    root.replaceChildren();
    buttons.clear();
    for (const { unit, name } of model.units) {
      const note = h('span', { class: 'note' });
      const button = h('button', { type: 'button', 'data-unit': unit }, name, note);
      button.addEventListener('click', () => onSelect(unit));
      buttons.set(unit, { button, note });
      root.append(button);
    }
  }

  return () => {
    setText(site, model.site);
    const names = model.units.map((entry) => entry.unit);
    if (names.join('\n') !== [...buttons.keys()].join('\n')) build();
    for (const entry of model.units) {
      const { button, note } = buttons.get(entry.unit)!;
      setAttributes(button, { 'aria-pressed': entry.unit === model.selected ? 'true' : 'false' });
      const open = model.standing.filter(
        (event) => event.unit === entry.unit && isOpen(event),
      ).length;
      const parts = [open > 0 && `${open} open`, entry.stale && 'stale'].filter(Boolean);
      setText(note, parts.join(', '));
      setAttributes(note, { hidden: parts.length === 0 });
    }
  };
}
