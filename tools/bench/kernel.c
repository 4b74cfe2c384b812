/* The sums of src/core/bed/kernel.ts (prepare, conduct, convect) for one flowing cell and step. */
#include <math.h>
#include <stdio.h>
#include <stdlib.h>
#include <time.h>

enum { CELLS = 100, SEGMENTS = 768 };

static double T0[SEGMENTS + 1], FE[SEGMENTS + 1], C[SEGMENTS], CF[SEGMENTS], FS[SEGMENTS], FF[SEGMENTS],
    PR[SEGMENTS], ST[SEGMENTS];
static double h[CELLS], t[CELLS], eq[CELLS], b[CELLS], k[CELLS];

int main(int argc, char **argv) {
  long steps = argc > 1 ? atol(argv[1]) : 20000;
  double dH = 1e6, dx = 0.09, dt = 60, flux = 0.65, flux06 = pow(flux, 0.6);
  for (int s = 0; s <= SEGMENTS; s++) { T0[s] = 260 + 0.7 * s; FE[s] = 520.3 * T0[s]; }
  for (int s = 0; s < SEGMENTS; s++) { C[s] = dH / 0.7; CF[s] = 520.3; FS[s] = 4; FF[s] = 80; PR[s] = 8e-4; ST[s] = 1; }
  for (int i = 0; i < CELLS; i++) h[i] = 1e8;
  struct timespec a, z;
  clock_gettime(CLOCK_MONOTONIC, &a);
  for (long n = 0; n < steps; n++) {
    for (int i = 0; i < CELLS; i++) {
      double scaled = h[i] / dH; int s = (int)floor(scaled);
      if (s < 0) s = 0; else if (s >= SEGMENTS) s = SEGMENTS - 1;
      double c = C[s], cf = CF[s], film = FS[s] + FF[s] * flux06;
      t[i] = T0[s] + (scaled - s) * dH / c;
      eq[i] = FE[s] + (scaled - s) * cf * dH / c;
      double lag = flux * cf * (1 + film * PR[s]) / (180 * film), nn = dx / lag, q = 1 - exp(-nn);
      double p = q * flux * cf * dt / (c * dx), relax = p > 1e-3 ? (1 - exp(-p)) / p : 1 - p / 2 + p * p / 6;
      b[i] = q * relax;
      double num = flux * cf * dx * ((2 - q) / (2 * q) - 1 / nn + p * p / (12 * q));
      double net = ST[s] + 0.5 * flux * 0.02 * cf - num;
      double least = -0.2 * flux * cf * lag;
      k[i] = net > least ? net : least;
    }
    double before = 0, f = dt / (dx * dx);
    for (int i = 0; i < CELLS; i++) {
      double after = i + 1 < CELLS ? f * 0.5 * (k[i] + k[i + 1]) * (t[i + 1] - t[i]) : 0;
      h[i] += after - before - 1e-4 * dt * (t[i] - 283);
      before = after;
    }
    double e = 520.3 * (n % 700 < 350 ? 733 : 300);
    for (int i = 0; i < CELLS; i++) { double x = b[i] * (e - eq[i]); e -= x; h[i] += flux * dt / dx * x; }
  }
  clock_gettime(CLOCK_MONOTONIC, &z);
  double ns = ((z.tv_sec - a.tv_sec) * 1e9 + (z.tv_nsec - a.tv_nsec)) / ((double)steps * CELLS);
  printf("%.3f %.6g\n", ns, h[CELLS / 2]);
  return 0;
}
