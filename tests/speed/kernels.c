/* The arithmetic of two paths of the program, plainly: one loop, no tricks. Compiled by tests/speed/__main__.py. */
#include <math.h>
#include <stddef.h>

static const double LN2 = 0.69314718055994530942;

/* Stress-gated switch in a self-timed chain of inverters, delay rule "step": time and energy at draws x supplies.
   Values per draw: d, p/(d V), R0 [ohm], slope [1/Pa in decades], thickness, sound speed, C of one switch. */
void chain(size_t draws, size_t supplies, const double *d, const double *per, const double *r0, const double *slope,
           const double *thickness, const double *speed, const double *c, const double *supply, double depth,
           double activity, double *time, double *energy)
{
    for (size_t i = 0; i < draws; i++) {
        const double transit = thickness[i] / speed[i], node = 2.0 * c[i];
        for (size_t j = 0; j < supplies; j++) {
            const double v = supply[j];
            const double pressure = per[i] * d[i] * v;
            const double on = r0[i] * exp(-2.30258509299404568402 * slope[i] * pressure);
            const double stage = transit + LN2 * on * node;
            const double whole = depth * stage;
            const double leak = depth * v * v / r0[i];
            time[i * supplies + j] = whole;
            energy[i * supplies + j] = depth * activity * node * v * v + leak * whole;
        }
    }
}

/* Virtual-source drain current, access resistances outside: Newton on I = I_model(I), as in
   benchmark/physics/virtual_source.py. Blocks small enough for the first cache, so that the loop over elements is the
   inner one and can be vectorised; a block ends when all its elements have. */
#define BLOCK 512

void drain_current(size_t n, const double *gate, const double *drain, const double *threshold, double phi, double delta,
                   double beta, double alpha, double slope, double cinv, double width, double velocity, double vsat,
                   double rs, double rd, double *out)
{
    const double wide = alpha * phi, r_s = rs / width, r_t = (rs + rd) / width, wv = width * velocity;
    double low[BLOCK], high[BLOCK], now[BLOCK];
    for (size_t start = 0; start < n; start += BLOCK) {
        const size_t count = n - start < BLOCK ? n - start : BLOCK;
        const double *vg0 = gate + start, *vd0 = drain + start, *vt = threshold + start;
        for (size_t i = 0; i < count; i++) {
            now[i] = low[i] = 0.0;
            high[i] = vd0[i] / r_t;
        }
        for (int step = 0; step < 40; step++) {
            double worst = 0.0;
            for (size_t i = 0; i < count; i++) {
                const double current = now[i];
                const double vg = vg0[i] - current * r_s, left = vd0[i] - current * r_t;
                const double vd = left > 0.0 ? left : 0.0;
                const double f_pre = 1.0 / (1.0 + exp((vg0[i] - vt[i] + delta * vd) / (1.5 * wide)));
                const double ab = 2.0 * phi * (1.0 - 0.99 * f_pre);
                const double ratio = vd / ab;
                const double correction = (0.5 + delta) * ab * exp(-ratio);
                const double y = vg + correction - vt[i] + delta * vd;
                const double ff = 1.0 / (1.0 + exp(y / wide + 0.5));
                const double z = (y + ff * wide) / (slope * phi);
                const double small = exp(-fabs(z));
                const double soft = (z > 0.0 ? z : 0.0) + log1p(small);
                const double soft_slope = (z >= 0.0 ? 1.0 : small) / (1.0 + small);
                const double charge = cinv * slope * phi * soft;
                const double vdsat = vsat + (phi - vsat) * ff;
                const double r = vd / vdsat, power = pow(r, beta), below = pow(1.0 + power, -1.0 / beta);
                const double model = wv * charge * r * below;
                const double rise = below / (1.0 + power), fermi = ff * (1.0 - ff);
                const double by_y = wv * (cinv * soft_slope * (1.0 - fermi) * r * below
                                          + charge * rise * r / vdsat * (phi - vsat) * fermi / wide);
                const double by_ab = (correction / ab) * (1.0 + ratio);
                const double pre = 1.98 / (1.5 * alpha) * f_pre * (1.0 - f_pre);
                const double by_drain = wv * charge * rise / vdsat
                                        + by_y * (delta + by_ab * pre * delta - correction / ab);
                const double excess = model - current;
                low[i] = excess > 0.0 ? current : low[i];
                high[i] = excess < 0.0 ? current : high[i];
                const double newton = current + excess / (1.0 + r_s * by_y + r_t * by_drain);
                const double next = newton >= low[i] && newton <= high[i] ? newton : 0.5 * (low[i] + high[i]);
                const double change = fabs(next - current) / next;
                worst = change > worst ? change : worst;
                now[i] = next;
            }
            if (worst <= 3e-8) /* the next step would change less than 1e-15 */
                break;
        }
        for (size_t i = 0; i < count; i++)
            out[start + i] = now[i];
    }
}
