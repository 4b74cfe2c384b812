/** A table that may be wider than a phone: it scrolls within itself, by keys too. */
export function Scrolled({
  label,
  children,
}: {
  label: string;
  children: preact.ComponentChildren;
}) {
  return (
    // biome-ignore lint/a11y/noNoninteractiveTabindex: what scrolls has to be reached by keys
    <section class="scrolled" tabIndex={0} aria-label={label}>
      {children}
    </section>
  );
}
