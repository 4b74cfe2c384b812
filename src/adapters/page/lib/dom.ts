/** Small helpers to make elements; text is always set as text, never as markup. */

type Attributes = Record<string, string | number | boolean | null | undefined>;
type Child = Node | string | null | undefined | false;

const SVG = 'http://www.w3.org/2000/svg';

function fill<E extends Element>(element: E, attributes: Attributes, children: Child[]): E {
  setAttributes(element, attributes);
  for (const child of children) if (child) element.append(child);
  return element;
}

export function h<K extends keyof HTMLElementTagNameMap>(
  tag: K,
  attributes: Attributes = {},
  ...children: Child[]
): HTMLElementTagNameMap[K] {
  return fill(document.createElement(tag), attributes, children);
}

export function s<K extends keyof SVGElementTagNameMap>(
  tag: K,
  attributes: Attributes = {},
  ...children: Child[]
): SVGElementTagNameMap[K] {
  return fill(document.createElementNS(SVG, tag) as SVGElementTagNameMap[K], attributes, children);
}

/** null, undefined and false take an attribute away; true sets it empty. */
export function setAttributes(element: Element, attributes: Attributes): void {
  for (const [name, value] of Object.entries(attributes)) {
    if (value === null || value === undefined || value === false) element.removeAttribute(name);
    else {
      const text = value === true ? '' : String(value);
      if (element.getAttribute(name) !== text) element.setAttribute(name, text);
    }
  }
}

/** Writes a text only where it differs: an unchanged live region stays silent. */
export function setText(element: Element, text: string): void {
  if (element.textContent !== text) element.textContent = text;
}

export function byId(id: string): HTMLElement {
  const element = document.getElementById(id);
  if (element === null) throw new RangeError(`byId: the page has no element #${id}`);
  return element;
}

/** A quantity with its unit: `62.0` `%`. */
export function unitText(unit: string): HTMLElement {
  const [name, index] = unit.split('_');
  return h('span', { class: 'unit' }, ` ${name}`, index && h('sub', {}, index));
}

/** A row of choices of which one holds; works with the arrow keys as radio buttons do. */
export function choices(
  legend: string,
  name: string,
  options: readonly { value: string; label: string }[],
  chosen: string,
  onChange: (value: string) => void,
): HTMLElement {
  const group = h('fieldset', { class: 'choices' }, h('legend', {}, legend));
  for (const { value, label } of options) {
    const input = h('input', { type: 'radio', name, value, checked: value === chosen });
    input.addEventListener('change', () => onChange(value));
    group.append(h('label', {}, input, h('span', {}, label)));
  }
  return group;
}
