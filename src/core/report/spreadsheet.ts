/** A number with or without its sign, as CSV has it: no formula. */
const NUMBER = /^[+-]?(?:\d+\.?\d*|\.\d+)(?:[eE][+-]?\d+)?$/;
/** What a spreadsheet takes for the beginning of a formula, behind blanks too; also the wide forms of it. */
const FORMULA = /^[\s\0]*[=+\-@\uff1d\uff0b\uff0d\uff20]/;
/** Some cut a tab or a line end off before they look. */
const CUT_OFF = /^[\t\r\n]/;

/**
 * A field of CSV after RFC 4180, section 2, for a spreadsheet that a person opens it in. A text that
 * would be taken for a formula gets an apostrophe ahead of it, which makes it a text: names, notes and
 * words come from outside. Numbers keep their signs.
 *
 * @param value null and undefined: an empty field
 */
export function spreadsheetField(value: string | number | boolean | null | undefined): string {
  if (value === null || value === undefined) return '';
  const text = String(value);
  const isFormula =
    typeof value === 'string' && !NUMBER.test(text) && (FORMULA.test(text) || CUT_OFF.test(text));
  const safe = isFormula ? `'${text}` : text;
  return /[",\r\n]/.test(safe) ? `"${safe.replaceAll('"', '""')}"` : safe;
}
