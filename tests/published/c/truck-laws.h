/* Laws of the reference truck, written down for this solution alone: SI units, absolute pressures. */
#ifndef TRUCK_LAWS_H
#define TRUCK_LAWS_H
#include <math.h>

static const double ATMOSPHERE = 101325, GRAVITY = 9.80665;

static double least(double a, double b) { return a < b ? a : b; }
static double most(double a, double b) { return a > b ? a : b; }
static double held(double x, double low, double high) { return least(most(x, low), high); }
static double smooth(double x) { x = held(x, 0, 1); return x * x * (3 - 2 * x); }
static double rest_jerk(double x) { x = held(x, 0, 1); return pow(x, 3) * (10 + x * (6 * x - 15)); }
static double soft_sign(double x) { return x / hypot(1, x); }

/* ---- oil: free air a0 over a liquid of tangent modulus K, K' = dK/dp -------------------------------------------- */

struct fluid { double density, air, u, v, capacity, intercept, slope; };

/* volume over that at the standard atmosphere */
static double volume_ratio(const struct fluid *f, double p) {
  const double above = p - ATMOSPHERE;
  return f->air * ATMOSPHERE / p + (1 - f->air) * (1 + f->u * above) / (1 + f->v * above);
}
static double volume_ratio_slope(const struct fluid *f, double p) {
  const double q = 1 + f->v * (p - ATMOSPHERE);
  return -f->air * ATMOSPHERE / (p * p) - (1 - f->air) * (f->v - f->u) / (q * q);
}
/* falling and hollow in p, so that Newton's method from the left climbs to the root without passing it */
static double pressure_of_ratio(const struct fluid *f, double ratio) {
  double p = f->air * ATMOSPHERE / ratio;
  for (int i = 0; i < 200; i++) {
    const double step = (volume_ratio(f, p) - ratio) / -volume_ratio_slope(f, p);
    p += step;
    if (fabs(step) < 1e-14 * p) break;
  }
  return p;
}
/* integral of dp over density from the standard atmosphere */
static double potential(const struct fluid *f, double p) {
  const double above = p - ATMOSPHERE, share = f->u / f->v;
  return (f->air * ATMOSPHERE * log(p / ATMOSPHERE) +
          (1 - f->air) * (share * above + (1 - share) * log1p(f->v * above) / f->v)) / f->density;
}
/* Walther: log10 log10 (nu + 0.7) = A - B log10 T, nu in mm2/s */
static double viscosity(const struct fluid *f, double T) {
  const double nu = pow(10, pow(10, f->intercept - f->slope * log10(held(T, 200, 500)))) - 0.7;
  return f->density * 1e-6 * most(nu, 0.2 - 0.7);
}

/* ---- nitrogen, by specific volume: Benedict, Webb, Rubin with the constants of Cooper and Goldfrank ------------- */

static const double R = 296.8, A0 = 136.009, B0 = 1.454325e-3, C0 = 1.04036e6, A = 0.115546, B = 2.96663e-6,
                    C = 3356.75, ALPHA = 5.786397e-9, GAMMA = 6.753931e-6, VIBRATION = 3364.011;

static double gas_pressure(int real, double v, double T) {
  if (!real) return R * T / v;
  return R * T / v + (B0 * R * T - A0 - C0 / (T * T)) / pow(v, 2) + (B * R * T - A) / pow(v, 3) + A * ALPHA / pow(v, 6) +
         C / (pow(v, 3) * T * T) * (1 + GAMMA / (v * v)) * exp(-GAMMA / (v * v));
}
static double gas_pressure_by_T(int real, double v, double T) {
  if (!real) return R / v;
  return R / v * (1 + B / (v * v)) + (B0 * R + 2 * C0 / pow(T, 3)) / (v * v) -
         2 * C / pow(v * T, 3) * (1 + GAMMA / (v * v)) * exp(-GAMMA / (v * v));
}
static double gas_pressure_by_v(int real, double v, double T) {
  if (!real) return -R * T / (v * v);
  const double g = GAMMA / (v * v);
  return -R * T / (v * v) - 2 * (B0 * R * T - A0 - C0 / (T * T)) / pow(v, 3) - 3 * (B * R * T - A) / pow(v, 4) -
         6 * A * ALPHA / pow(v, 7) + C / (T * T * pow(v, 4)) * exp(-g) * (-3 * (1 + g) - 2 * g + 2 * g * (1 + g));
}
static double gas_capacity(int real, double v, double T) {
  if (!real) return 2.5 * R;
  const double y = VIBRATION / T, e = exp(-y);
  return 2.5 * R + R * y * y * e / pow(1 - e, 2) + 6 / pow(T, 3) * (C0 / v - C / GAMMA) +
         3 * C / pow(T, 3) * (2 / GAMMA + 1 / (v * v)) * exp(-GAMMA / (v * v));
}

/* ---- friction that sticks and slips: Dahl's bristle, with damping on its rate and a Stribeck level ---------------- */

struct bristle { double torque, rate; };
static struct bristle rub(double capacity, double slip, double z, double level, double angle, double damping) {
  const double moved = slip - fabs(slip) * z / level;
  return (struct bristle){capacity * (z + damping * moved), moved / angle};
}
static double stribeck(double slip, double factor, double width) {
  return 1 + (factor - 1) * exp(-pow(slip / width, 2));
}
#endif
