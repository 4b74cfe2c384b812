import { z } from 'zod';

/** The payloads, said a second time and independently: what parsePayload is held against. */
const NUMBER = z.number();
const QUALITY = z.enum(['good', 'uncertain', 'bad']).default('good').catch('bad');
const TIME = z
  .union([
    z
      .number()
      .min(-8.64e15)
      .max(8.64e15)
      .transform((ms) => Math.floor(ms)),
    z.iso.datetime({ offset: true }).transform((text) => Math.floor(Date.parse(text))),
  ])
  .optional();

export const valueMessage = z.object({
  time: TIME,
  value: z.union([NUMBER, z.null()]),
  quality: QUALITY,
});

/** An entry of a wrong type spoils only itself. */
const entry = z.union([NUMBER, z.null()]).catch(null);

export function arrayMessage(length: number) {
  return z.object({
    time: TIME,
    values: z.array(entry).length(length),
    quality: z.union([
      z.array(QUALITY).length(length),
      // The catch of QUALITY would take a list of another length for one unknown word.
      z
        .unknown()
        .optional()
        .refine((stated) => !Array.isArray(stated))
        .pipe(QUALITY),
    ]),
  });
}
