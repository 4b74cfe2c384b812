/** Small helpers for drawings made by hand; text is always set as text, never as markup. */

type Attributes = Record<string, string | number | boolean | null | undefined>;
type Child = Node | string | null | undefined | false;

const SVG = 'http://www.w3.org/2000/svg';

function fill<E extends Element>(element: E, attributes: Attributes, children: Child[]): E {
  setAttributes(element, attributes);
  for (const child of children) if (child) element.append(child);
  return element;
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

export function byId(id: string): HTMLElement {
  const element = document.getElementById(id);
  if (element === null) throw new RangeError(`byId: the page has no element #${id}`);
  return element;
}
