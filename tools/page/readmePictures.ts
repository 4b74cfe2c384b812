import type { Page } from 'playwright-core';

export interface Picture {
  readonly path: string;
  readonly file: string;
  readonly width: number;
  readonly height: number;
  readonly dark: boolean;
}

/** The pictures of README.md. */
export const PICTURES: readonly Picture[] = [
  { path: 'now', file: 'now.webp', width: 1280, height: 1060, dark: false },
  { path: 'rock/playback', file: 'rock.webp', width: 1280, height: 1140, dark: false },
  { path: 'offer/table', file: 'offer.webp', width: 1280, height: 1060, dark: true },
  { path: 'now', file: 'phone.webp', width: 390, height: 844, dark: true },
];

const MOST_BYTES = 60_000;
/** README.md shows no wider ones. */
const MOST_WIDTH = 860;

/** What is in view as WebP, as wide as it is shown and as fine as fits into 60 kB. */
export async function smallPicture(page: Page): Promise<Buffer> {
  const session = await page.context().newCDPSession(page);
  const { width, height } = page.viewportSize() ?? { width: MOST_WIDTH, height: MOST_WIDTH };
  const clip = { x: 0, y: 0, width, height, scale: Math.min(1, MOST_WIDTH / width) };
  try {
    for (let quality = 80; ; quality -= 10) {
      const { data } = await session.send('Page.captureScreenshot', {
        ...{ format: 'webp', quality, clip },
      });
      const picture = Buffer.from(data, 'base64');
      if (picture.length <= MOST_BYTES || quality <= 10) return picture;
    }
  } finally {
    await session.detach();
  }
}
