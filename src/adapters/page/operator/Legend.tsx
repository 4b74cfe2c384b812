import type { ComponentChildren } from 'preact';
/** What the marks mean; drawn with the same marks. */
export function Legend() {
  return (
    <ul class="legend" aria-label="Legend">
      <Item text="estimate">
        <path class="key-estimate" d="M1,7 H21" />
      </Item>
      <Item text="± 2 sigma">
        <rect class="key-band" x="1" y="2" width="20" height="10" />
      </Item>
      <Item text="each string’s tube">
        <path class="key-tube" d="M1,7 H21" />
      </Item>
      <Item text="reading">
        <circle class="key-used" cx="11" cy="7" r="3" />
      </Item>
      <Item text="rejected reading">
        <path class="key-rejected" d="M7,3 l8,8 m0,-8 l-8,8" />
      </Item>
      <Item text="missing">
        <circle class="key-missing" cx="11" cy="7" r="4.2" />
      </Item>
      <Item text="front, 16–84 % width">
        <path class="key-front" d="M1,7 H21" />
      </Item>
      <Item text="charged rock">
        <rect class="key-stone" x="4" y="1" width="12" height="12" />
      </Item>
      <Item text="spent rock">
        <rect class="key-spent" x="4" y="1" width="12" height="12" />
      </Item>
    </ul>
  );
}

function Item({ text, children }: { text: string; children: ComponentChildren }) {
  return (
    <li>
      <svg width="22" height="14" aria-hidden="true">
        {children}
      </svg>
      {text}
    </li>
  );
}
