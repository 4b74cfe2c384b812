const ESCAPES: Readonly<Record<string, string>> = {
  '&': '&amp;',
  '<': '&lt;',
  '>': '&gt;',
  '"': '&quot;',
  "'": '&#39;',
};

/** Text as it may stand in HTML and in attributes. */
export function escapeText(text: string): string {
  return text.replace(/[&<>"']/g, (sign) => ESCAPES[sign] as string);
}
