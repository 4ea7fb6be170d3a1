/*
 * The reference truck's plant, written by hand from the laws and solved by CVODE (backward differentiation, dense
 * Newton, tolerance 1e-9): an independent solution to compare the bench with. Reads parameters, start values and the
 * commands of every tick from a text, writes six pressures and five speeds per tick as doubles.
 *
 *   truck INPUT OUTPUT
 *
 * Input lines: `n element.name value` (parameters, fluid, ratios, states, memory), `u element.command` (their order),
 * `t` (a tick begins), `c index value` (a command that changed at the start of that tick).
 */
#include <cvode/cvode.h>
#include <nvector/nvector_serial.h>
#include <stdio.h>
#include <stdlib.h>
#include <string.h>
#include <sunlinsol/sunlinsol_dense.h>
#include <sunmatrix/sunmatrix_dense.h>

#include "truck-laws.h"

/* ---- input ------------------------------------------------------------------------------------------------------ */

struct named { char name[80]; double value; };
static struct named numbers[4000], commands[400];
static int number_count, command_count;

static double *find(struct named *list, int count, const char *name) {
  for (int i = 0; i < count; i++)
    if (!strcmp(list[i].name, name)) return &list[i].value;
  fprintf(stderr, "truck: no %s in the input\n", name);
  exit(2);
}
static double number(const char *element, const char *name) {
  char path[160];
  snprintf(path, sizeof path, "%s.%s", element, name);
  return *find(numbers, number_count, path);
}
static double *command(const char *path) { return find(commands, command_count, path); }
/* the same, looked up once at each place in the code */
#define NUMBER(element, name) \
  (*({ static double *at; at ? at : (at = find(numbers, number_count, element "." name)); }))
#define COMMAND(path) (*({ static double *at; at ? at : (at = command(path)); }))
static void only(const char *element, const char *name, double value) {
  if (number(element, name) == value) return;
  fprintf(stderr, "truck: %s.%s is %g, and only %g is written here\n", element, name, number(element, name), value);
  exit(2);
}

/* ---- states ----------------------------------------------------------------------------------------------------- */

enum state {
  HIGH_MASS, HIGH_HEAT, HIGH_GAS, HIGH_WALL, LOW_MASS, LOW_HEAT, LOW_GAS, LOW_WALL, HIGH_LINE, HIGH_LINE_HEAT, LOW_LINE,
  LOW_LINE_HEAT, CASE, CASE_HEAT, TANK, TANK_HEAT, VALVE, MAIN_LIFT, LOW_LIFT, CHECK, CHARGE_LIFT, CHARGE_SPEED, STROKE,
  STROKE_RATE, INDICATED, IDLE, ENGINE, GEARBOX_IN, PROP, PUMP, REAR, FRONT, SPEED, PITCH, ROLLING, ENGINE_CLUTCH,
  ENGINE_CLUTCH_Z, GEAR, GEAR_Z, DISCONNECT, DISCONNECT_Z, TWIST, REAR_BRAKE, REAR_BRAKE_Z, FRONT_BRAKE, FRONT_BRAKE_Z,
  REAR_TYRE, FRONT_TYRE, STATES
};
static const char *state_names[STATES] = {
    "highAccumulator.mass", "highAccumulator.heat", "highAccumulator.gasTemperature", "highAccumulator.wallTemperature",
    "lowReservoir.mass", "lowReservoir.heat", "lowReservoir.gasTemperature", "lowReservoir.wallTemperature",
    "highLine.mass", "highLine.heat", "lowLine.mass", "lowLine.heat", "pumpCase.mass", "pumpCase.heat", "tank.mass",
    "tank.heat", "isolationValve.position", "mainRelief.lift", "lowRelief.lift", "antiCavitation.opening",
    "chargePump.reliefLift", "chargePump.speed", "pumpMotor.displacement", "pumpMotor.displacementRate",
    "engine.indicatedTorque", "engine.idleTorque", "engineShaft.speed", "gearboxInput.speed", "propShaft.speed",
    "pumpShaft.speed", "rearAxle.speed", "frontWheels.speed", "body.velocity", "body.pitchAcceleration",
    "body.rollingDeflection", "engineClutch.application", "engineClutch.deflection", "gearbox.capacity",
    "gearbox.deflection", "disconnectClutch.application", "disconnectClutch.deflection", "halfShafts.twist",
    "rearBrake.application", "rearBrake.deflection", "frontBrake.application", "frontBrake.deflection",
    "rearTyres.deflection", "frontTyres.deflection"};

/* ---- parts ------------------------------------------------------------------------------------------------------ */

static struct fluid oil;
struct contents { double pressure, temperature, density, potential, viscosity, mass_flow, heat_flow; };

struct accumulator {
  double volume, closing, end, stop, gas_mass, time, foam, wall, to_ambient, to_oil, ambient, metal;
  int real;
};
struct volume { double size, metal; };
struct relief { double cracking, full, rate, reseat, lag, rounding, smoothing; int lifted; };
struct friction { double torque, time, angle, damping, factor, width; };
struct tyre { double radius, share, axle, b, c, d, e, length, creep, time, speed; };
struct orifice { double area, coefficient, smoothing; };

static struct {
  struct accumulator high, low;
  struct volume high_line, low_line, pump_case, tank;
  struct relief main_relief, low_relief;
  struct orifice valve, check, neck, drain;
  struct friction engine_clutch, disconnect, rear_brake, front_brake;
  struct tyre rear, front;
  double disconnect_ratio;
  double valve_opens, valve_closes, valve_dead, valve_lag, valve_leak, valve_accepted, valve_waited, valve_off;
  double check_cracking, check_over, check_lag;
  double gear, ratio, neutral, locked;
} truck;

static struct accumulator accumulator(const char *name) {
  const double volume = number(name, "volume");
  if (number(name, "gas") > 1) only(name, "gas", 1);
  return (struct accumulator){volume, number(name, "closingShare") * volume, (1 - number(name, "leastGasShare")) * volume,
      number(name, "stopPressure"), number(name, "gasMass"), number(name, "timeConstant"),
      number(name, "foamHeatCapacity"), number(name, "wallHeatCapacity"), number(name, "ambientConductance"),
      number(name, "oilConductance"), number(name, "ambientTemperature"),
      number(name, "metalShare") * oil.density * volume, number(name, "gas") == 0};
}
static struct volume volume(const char *name) {
  const double size = number(name, "volume");
  return (struct volume){size, number(name, "metalShare") * oil.density * size};
}
static struct relief relief(const char *name) {
  return (struct relief){number(name, "cracking"), number(name, "fullFlow"), number(name, "fullFlowRate"),
      number(name, "reseat"), number(name, "lag"), number(name, "rounding"), number(name, "smoothing"),
      number(name, "lifted") > 0.5};
}
static struct orifice orifice(const char *name) {
  return (struct orifice){number(name, "area"), number(name, "dischargeCoefficient"), number(name, "smoothing")};
}
static struct friction friction(const char *name, const char *time) {
  return (struct friction){number(name, "maximumTorque"), number(name, time), number(name, "bristleAngle"),
      number(name, "bristleDamping"), number(name, "staticFactor"), number(name, "staticWidth")};
}
static struct tyre tyre(const char *name) {
  only(name, "model", 0);
  return (struct tyre){number(name, "radius"), number(name, "loadShare"), number(name, "axlePosition"),
      number(name, "stiffnessFactor"), number(name, "shapeFactor"), number(name, "peakFriction"),
      number(name, "curvatureFactor"), number(name, "relaxationLength"), number(name, "creepSpeed"),
      number(name, "dampingTime"), number(name, "dampingSpeed")};
}

/* ---- hydraulics ------------------------------------------------------------------------------------------------- */

static struct contents at_pressure(double pressure, double temperature, double density) {
  return (struct contents){pressure, temperature, density, potential(&oil, pressure), viscosity(&oil, temperature), 0, 0};
}
static struct contents closed(const struct volume *it, double mass, double heat) {
  const double p = pressure_of_ratio(&oil, oil.density * it->size / mass);
  return at_pressure(p, heat / (oil.capacity * (mass + it->metal)), mass / it->size);
}

/* oil volume, from which gas volume and pressure follow: V rho(p(V)) = m by Newton's method within a bracket */
struct charge { double oil, gas, pressure, by_oil, by_T, share; };
static struct charge charged(const struct accumulator *it, double mass, double T) {
  struct charge c;
  double low = 1e-9 * it->volume, high = 0.994 * it->volume, V = least(mass / oil.density, 0.95 * it->volume);
  for (int i = 0; i < 200; i++) {
    const double shut = most(0, 1 - V / it->closing), past = most(0, V - it->end) / (5 * it->closing);
    c.share = 1 - pow(shut, 3);
    c.gas = it->volume - V + 0.25 * it->closing * (1 - pow(shut, 4));
    const double v = c.gas / it->gas_mass, gas = gas_pressure(it->real, v, T);
    c.oil = V;
    c.pressure = gas * c.share + it->stop * pow(past, 3);
    c.by_T = gas_pressure_by_T(it->real, v, T) * c.share;
    c.by_oil = gas * 3 * shut * shut / it->closing - c.share * c.share * gas_pressure_by_v(it->real, v, T) / it->gas_mass +
               it->stop * 3 * past * past / (5 * it->closing);
    const double x = volume_ratio(&oil, c.pressure), excess = V - mass / oil.density * x;
    const double slope = 1 - mass / oil.density * volume_ratio_slope(&oil, c.pressure) * c.by_oil;
    if (excess > 0) high = V; else low = V;
    double next = V - excess / slope;
    if (!(next > low && next < high)) next = 0.5 * (low + high);
    if (fabs(next - V) < 1e-15 * it->volume) break;
    V = next;
  }
  return c;
}
static struct contents oil_of(const struct accumulator *it, const struct charge *c, double mass, double heat) {
  return at_pressure(c->pressure, heat / (oil.capacity * (mass + it->metal)),
                     mass / c->oil * most(1e-4, smooth(10 * c->oil / it->closing)));
}
static void breathe(const struct accumulator *it, const struct charge *c, const struct contents *o, const double *y, double *d) {
  const double mass = y[0], T = y[2], wall = y[3], v = c->gas / it->gas_mass;
  const double capacity = it->gas_mass * gas_capacity(it->real, v, T), by_T = gas_pressure_by_T(it->real, v, T);
  const double from_wall = capacity * (wall - T) / it->time, from_oil = it->to_oil * (o->temperature - wall);
  /* dV = a dm + b dT from V = m x(p(V, T)); (C + foam) dT = Q + T pT s dV */
  const double relaxed = mass / oil.density, slope = volume_ratio_slope(&oil, c->pressure);
  const double a = volume_ratio(&oil, c->pressure) / oil.density / (1 - relaxed * slope * c->by_oil);
  const double b = relaxed * slope * c->by_T / (1 - relaxed * slope * c->by_oil);
  const double work = T * by_T * c->share;
  d[0] = o->mass_flow;
  d[1] = o->heat_flow - from_oil;
  d[2] = (from_wall + work * a * o->mass_flow) / (capacity + it->foam - work * b);
  d[3] = (from_oil - from_wall + it->to_ambient * (it->ambient - wall)) / it->wall;
}

/* mass flows from a to b and carries its heat; `lost` warms the side where it comes out */
static void pass(struct contents *a, struct contents *b, double flow, double lost) {
  const double carried = oil.capacity * flow * (flow > 0 ? a->temperature : b->temperature);
  a->mass_flow -= flow;
  b->mass_flow += flow;
  a->heat_flow += (flow > 0 ? 0 : lost) - carried;
  b->heat_flow += (flow > 0 ? lost : 0) + carried;
}
static void throttle(struct contents *a, struct contents *b, double flow) {
  pass(a, b, flow, flow * (a->potential - b->potential));
}
static double root(double dp, double smoothing) { return dp / pow(dp * dp + smoothing * smoothing, 0.25); }
static double through(const struct orifice *o, double area, const struct contents *a, const struct contents *b) {
  const double dp = a->pressure - b->pressure;
  return o->coefficient * area * sqrt(2 * (dp > 0 ? a->density : b->density)) * root(dp, o->smoothing);
}
static double rounded_ramp(double x, double width) { return 0.5 * (x + hypot(x, width)); }
static double over(double p, double cracking, double full, double width) {
  return rounded_ramp(p - cracking, width) / (full - cracking);
}
static double lift_for(double share, double dp, double rated) { return share / sqrt(most(dp / rated, 0.1)); }

static double relieve(const struct relief *r, struct contents *a, struct contents *b, double lift) {
  const double rated = r->full - ATMOSPHERE, dp = a->pressure - b->pressure;
  const double flow = r->rate * most(lift, 0) * root(dp, r->smoothing) / sqrt(rated);
  throttle(a, b, flow * (flow > 0 ? a->density : b->density));
  const double lifted = r->lifted ? 1 : smooth((a->pressure - r->cracking) / (0.07 * (r->full - r->cracking)));
  const double cracking = r->cracking * (1 - (1 - r->reseat) * lifted);
  return (lift_for(over(a->pressure, cracking, r->full, r->rounding), dp, rated) - lift) / r->lag;
}

/* ---- the whole truck -------------------------------------------------------------------------------------------- */

static double wilson(double viscous, double dry, double constant, double width, double dp, double speed, double mu, double D) {
  return viscous * D * mu * speed + (dry * D * hypot(dp, 2e5) + constant) * soft_sign(speed / width);
}
static double carried_density(double high, double low, double drawing, double width) {
  return low + 0.5 * (high - low) * (1 + soft_sign(drawing / width));
}

static void charge_pump(struct contents *in, struct contents *out, const double *y, double *d) {
  const double D = NUMBER("chargePump", "displacement") / (2 * M_PI), dp = out->pressure - in->pressure, w = y[CHARGE_SPEED];
  const double slip = NUMBER("chargePump", "slipCoefficient") * COMMAND("chargePump.wear") * D * dp / in->viscosity;
  const double rated = NUMBER("chargePump", "fullFlow") - ATMOSPHERE;
  const double back = NUMBER("chargePump", "fullFlowRate") * most(y[CHARGE_LIFT], 0) * root(dp, 2e4) / sqrt(rated);
  const double back_mass = slip * (slip > 0 ? out->density : in->density) + back * (back > 0 ? out->density : in->density);
  const double rho = carried_density(out->density, in->density, -w, NUMBER("chargePump", "smoothSpeed"));
  const double pumped = rho * D * w, net = pumped - back_mass;
  const double rubbing = wilson(NUMBER("chargePump", "viscousCoefficient"), NUMBER("chargePump", "frictionCoefficient"), NUMBER("chargePump", "dryTorque"),
                                NUMBER("chargePump", "smoothSpeed"), dp, w, in->viscosity, D) * w, back_loss = back_mass * (out->potential - in->potential);
  const double carried = oil.capacity * net * (net > 0 ? in->temperature : out->temperature);
  in->mass_flow -= net;
  out->mass_flow += net;
  in->heat_flow += (pumped > 0 ? 0 : rubbing) + (back_mass > 0 ? back_loss : 0) - carried;
  out->heat_flow += (pumped > 0 ? rubbing : 0) + (back_mass > 0 ? 0 : back_loss) + carried;
  const double share = over(out->pressure, NUMBER("chargePump", "cracking"), NUMBER("chargePump", "fullFlow"), 1e4);
  d[CHARGE_LIFT] = (lift_for(share, dp, rated) - y[CHARGE_LIFT]) / NUMBER("chargePump", "reliefLag");
  const double wanted = COMMAND("chargePump.power") > 0.5
                            ? held(COMMAND("chargePump.speedRequest"), 0, NUMBER("chargePump", "maximumSpeed")) : 0;
  d[CHARGE_SPEED] = (wanted - w) / NUMBER("chargePump", "speedLag");
}

static double pump_motor(struct contents *high, struct contents *low, struct contents *box, const double *y, double *d) {
  const double D = NUMBER("pumpMotor", "displacement") / (2 * M_PI), x = held(y[STROKE], -1, 1), w = y[PUMP];
  const double dp = high->pressure - low->pressure, mu = 0.5 * (high->viscosity + low->viscosity);
  const double rubbing = COMMAND("pumpMotor.frictionFactor") * wilson(NUMBER("pumpMotor", "viscousCoefficient"), NUMBER("pumpMotor", "frictionCoefficient"), NUMBER("pumpMotor", "dryTorque"),
                                NUMBER("pumpMotor", "smoothSpeed"), dp, w, mu, D);
  const double leak = COMMAND("pumpMotor.wear") * NUMBER("pumpMotor", "slipCoefficient") * D / mu;
  const double to_case = NUMBER("pumpMotor", "caseLeakShare") * leak, inside = leak - to_case;
  const double rho = carried_density(high->density, low->density, x * w, NUMBER("pumpMotor", "smoothSpeed"));
  const double ideal = rho * D * x * w, hot = NUMBER("pumpMotor", "caseHeatShare");
  /* displaced oil: no loss of its own, friction warms where it goes */
  pass(high, low, ideal, 0);
  (ideal > 0 ? low : high)->heat_flow += (1 - hot) * rubbing * w;
  box->heat_flow += hot * rubbing * w;
  /* gaps */
  const double across = inside * dp, down = to_case * (high->pressure - box->pressure), up = to_case * (low->pressure - box->pressure);
  throttle(high, low, across * (across > 0 ? high->density : low->density));
  throttle(high, box, down * (down > 0 ? high->density : box->density));
  throttle(low, box, up * (up > 0 ? low->density : box->density));
  /* actuator */
  const double floor_ = NUMBER("pumpMotor", "leastDifference"), wn = NUMBER("pumpMotor", "naturalFrequency"), z = NUMBER("pumpMotor", "damping");
  double wanted = COMMAND("pumpMotor.torqueRequest") * dp / (D * (dp * dp + floor_ * floor_));
  wanted = COMMAND("pumpMotor.enable") > 0.5 ? held(held(wanted, -1, 1), NUMBER("pumpMotor", "leastDisplacement"), 1) : 0;
  const double rate = held(wn / (2 * z) * (wanted - y[STROKE]), -NUMBER("pumpMotor", "rateLimit"), NUMBER("pumpMotor", "rateLimit"));
  d[STROKE] = y[STROKE_RATE];
  d[STROKE_RATE] = 2 * z * wn * (rate - y[STROKE_RATE]);
  return D * x * rho * (high->potential - low->potential) - rubbing;
}

static double engine(const double *y, double *d) {
  const double w = y[ENGINE], V = NUMBER("engine", "sweptVolume") / (4 * M_PI);
  const double drag = V * (NUMBER("engine", "dragPressure") + NUMBER("engine", "dragRise") * fabs(w));
  const double speeds[] = {NUMBER("engine", "fullLoadSpeed1"), NUMBER("engine", "fullLoadSpeed2"), NUMBER("engine", "fullLoadSpeed3"),
                           NUMBER("engine", "fullLoadSpeed4"), NUMBER("engine", "fullLoadSpeed5")};
  const double torques[] = {NUMBER("engine", "fullLoadTorque1"), NUMBER("engine", "fullLoadTorque2"), NUMBER("engine", "fullLoadTorque3"),
                            NUMBER("engine", "fullLoadTorque4"), NUMBER("engine", "fullLoadTorque5")};
  double full = torques[0], slope = 0;
  for (int i = 0; i < 4; i++) {
    const double next = (torques[i + 1] - torques[i]) / (speeds[i + 1] - speeds[i]);
    full += (next - slope) * rounded_ramp(most(w, 0) - speeds[i], 5);
    slope = next;
  }
  full = COMMAND("engine.derate") * most(full, 0);
  const double on = COMMAND("engine.ignition"), limit = NUMBER("engine", "idleLimit");
  const double governor = held(y[IDLE] + NUMBER("engine", "idleGain") * (NUMBER("engine", "idleSpeed") - w), -drag, limit);
  const double request = most(COMMAND("engine.torqueRequest"), 0);
  const double asked = request + drag * (1 - exp(-request / NUMBER("engine", "requestWidth")));
  const double demand = on * held(most(asked, governor + drag), 0, full + drag);
  d[INDICATED] = (demand - y[INDICATED]) / (demand > y[INDICATED] ? NUMBER("engine", "airPathTime") : NUMBER("engine", "cutTime"));
  d[IDLE] = (on * held(governor, -0.1 * limit, limit) - y[IDLE]) / NUMBER("engine", "idleTime");
  return y[INDICATED] * smooth((w - NUMBER("engine", "firingSpeed")) / 12 + 0.5) - drag * soft_sign(w);
}

static double clutch(const struct friction *f, double slip, double wanted, const double *y, double *d) {
  const struct bristle b = rub(f->torque * y[0], slip, y[1], stribeck(slip, f->factor, f->width), f->angle, f->damping);
  d[0] = (wanted - y[0]) / f->time;
  d[1] = b.rate;
  return b.torque;
}

static double tyre_force(const struct tyre *t, double friction, double wheel, double v, double weight, double shift,
                         double transfer, double u, double *rate) {
  const double sliding = wheel * t->radius - v, load = most(t->share * weight + t->axle * shift + transfer, 0);
  const double grip = most(friction, 0.01), k = t->b * u / t->length;
  const double curve = t->d * grip * sin(t->c * atan(k - t->e * (k - atan(k))));
  const double damping = t->time * t->b * t->c * t->d * load * grip / t->length * sliding *
                         exp(-(sliding * sliding + v * v) / (t->speed * t->speed));
  *rate = sliding - u / t->length * sqrt(v * v + sliding * sliding / 9 + t->creep * t->creep);
  return load * curve + damping;
}

static int rates(double t, N_Vector state, N_Vector slope, void *unused) {
  (void)t, (void)unused;
  const double *y = N_VGetArrayPointer(state);
  double *d = N_VGetArrayPointer(slope);
  /* oil */
  const struct charge full = charged(&truck.high, y[HIGH_MASS], y[HIGH_GAS]), low = charged(&truck.low, y[LOW_MASS], y[LOW_GAS]);
  struct contents ha = oil_of(&truck.high, &full, y[HIGH_MASS], y[HIGH_HEAT]);
  struct contents lr = oil_of(&truck.low, &low, y[LOW_MASS], y[LOW_HEAT]);
  struct contents hl = closed(&truck.high_line, y[HIGH_LINE], y[HIGH_LINE_HEAT]);
  struct contents ll = closed(&truck.low_line, y[LOW_LINE], y[LOW_LINE_HEAT]);
  struct contents box = closed(&truck.pump_case, y[CASE], y[CASE_HEAT]);
  const double ambient = NUMBER("tank", "ambientPressure"), tank_ratio = volume_ratio(&oil, ambient);
  const double tank_full = oil.density * truck.tank.size / tank_ratio;
  struct contents tank = at_pressure(ambient, y[TANK_HEAT] / (oil.capacity * (y[TANK] + truck.tank.metal / tank_ratio)),
                                     oil.density / tank_ratio * most(1e-5, smooth(20 * y[TANK] / tank_full)));
  const double opening = rest_jerk(y[VALVE]);
  throttle(&ha, &hl, through(&truck.valve, truck.valve.area * opening + truck.valve_leak, &ha, &hl));
  throttle(&ll, &hl, through(&truck.check, truck.check.area * most(y[CHECK], 0), &ll, &hl));
  throttle(&lr, &ll, through(&truck.neck, truck.neck.area, &lr, &ll));
  throttle(&box, &tank, through(&truck.drain, truck.drain.area, &box, &tank));
  d[VALVE] = held((truck.valve_accepted - y[VALVE]) / truck.valve_lag, -1 / truck.valve_closes, 1 / truck.valve_opens);
  d[CHECK] = (smooth((ll.pressure - hl.pressure - truck.check_cracking) / truck.check_over) - y[CHECK]) / truck.check_lag;
  d[MAIN_LIFT] = relieve(&truck.main_relief, &hl, &ll, y[MAIN_LIFT]);
  d[LOW_LIFT] = relieve(&truck.low_relief, &ll, &tank, y[LOW_LIFT]);
  charge_pump(&tank, &ll, y, d);
  const double pump_torque = pump_motor(&hl, &ll, &box, y, d);
  breathe(&truck.high, &full, &ha, &y[HIGH_MASS], &d[HIGH_MASS]);
  breathe(&truck.low, &low, &lr, &y[LOW_MASS], &d[LOW_MASS]);
  d[HIGH_LINE] = hl.mass_flow, d[HIGH_LINE_HEAT] = hl.heat_flow;
  d[LOW_LINE] = ll.mass_flow, d[LOW_LINE_HEAT] = ll.heat_flow;
  d[CASE] = box.mass_flow, d[CASE_HEAT] = box.heat_flow;
  d[TANK] = tank.mass_flow;
  d[TANK_HEAT] = tank.heat_flow + NUMBER("tank", "conductance") * (NUMBER("tank", "ambientTemperature") - tank.temperature);
  /* driveline */
  const double engine_torque = engine(y, d) + NUMBER("starter", "constantTorque") + COMMAND("starter.torque");
  const double clutch_torque = clutch(&truck.engine_clutch, y[ENGINE] - y[GEARBOX_IN],
      COMMAND("engineClutch.engagement") * COMMAND("engineClutch.capacityFactor"), &y[ENGINE_CLUTCH], &d[ENGINE_CLUTCH]);
  const double ratio = truck.ratio, slip = y[GEARBOX_IN] - ratio * y[PROP];
  const struct bristle gear = rub(y[GEAR], slip, y[GEAR_Z], 1, NUMBER("gearbox", "bristleAngle") * fabs(ratio),
                                  NUMBER("gearbox", "bristleDamping") / fabs(ratio));
  const double drag = NUMBER("gearbox", "dragTorque") * soft_sign(y[GEARBOX_IN]);
  const double mesh = NUMBER("gearbox", "meshLoss") * fabs(ratio * gear.torque) * soft_sign(y[PROP] / 0.5);
  const double sync = NUMBER("gearbox", "synchroniserTorque"), lock = NUMBER("gearbox", "lockTorque");
  const double settled = 1 / (1 + pow(slip / NUMBER("gearbox", "synchronousSpeed"), 2));
  const double goal = truck.gear == 0 ? 0 : truck.locked ? lock : sync + (lock - sync) * settled * settled;
  d[GEAR] = (goal - y[GEAR]) / NUMBER("gearbox", "engagementTime");
  d[GEAR_Z] = gear.rate;
  const double r = truck.disconnect_ratio;
  const double pump_clutch = clutch(&truck.disconnect, y[PUMP] - r * y[PROP],
      COMMAND("disconnectClutch.engagement") * COMMAND("disconnectClutch.capacityFactor"), &y[DISCONNECT], &d[DISCONNECT]);
  const double axle_ratio = NUMBER("rearAxle", "ratio"), twisting = y[PROP] - axle_ratio * y[REAR];
  const double half = NUMBER("halfShafts", "stiffness") * y[TWIST] + NUMBER("halfShafts", "damping") * twisting;
  d[TWIST] = twisting;
  const double rear_brake = clutch(&truck.rear_brake, y[REAR], COMMAND("rearBrake.demand") * COMMAND("rearBrake.gainFactor"),
                                   &y[REAR_BRAKE], &d[REAR_BRAKE]);
  const double front_brake = clutch(&truck.front_brake, y[FRONT], COMMAND("frontBrake.demand") * COMMAND("frontBrake.gainFactor"),
                                    &y[FRONT_BRAKE], &d[FRONT_BRAKE]);
  /* road; the payload stands still */
  const double mass = NUMBER("body", "mass") + NUMBER("body", "loadedMass"), grade = COMMAND("body.grade"), v = y[SPEED];
  const double weight = mass * GRAVITY / hypot(1, grade), shift = mass * y[PITCH] * NUMBER("body", "heightOfCentre") / NUMBER("body", "wheelbase");
  const double rear = tyre_force(&truck.rear, COMMAND("rearTyres.surfaceFriction"), y[REAR], v, weight, shift,
                                 COMMAND("rearTyres.loadTransfer"), y[REAR_TYRE], &d[REAR_TYRE]);
  const double front = tyre_force(&truck.front, COMMAND("frontTyres.surfaceFriction"), y[FRONT], v, weight, shift,
                                  COMMAND("frontTyres.loadTransfer"), y[FRONT_TYRE], &d[FRONT_TYRE]);
  const struct bristle roll = rub(NUMBER("body", "constantLoad") + NUMBER("body", "rollingResistance") * weight, v, y[ROLLING], 1,
                                  NUMBER("body", "rollingLength"), NUMBER("body", "rollingDamping"));
  const double wind = v + COMMAND("body.headwind");
  const double air = (NUMBER("body", "quadraticLoad") + 0.5 * NUMBER("body", "airDensity") * NUMBER("body", "dragArea")) * wind * fabs(wind);
  const double downhill = weight * grade;
  const double acceleration = (rear + front - roll.torque - NUMBER("body", "linearLoad") * v - air - downhill) / mass;
  d[SPEED] = acceleration;
  d[PITCH] = (acceleration - y[PITCH]) / NUMBER("body", "pitchTime");
  d[ROLLING] = roll.rate;
  d[ENGINE] = (engine_torque - clutch_torque - NUMBER("engineShaft", "viscousFriction") * y[ENGINE]) / NUMBER("engineShaft", "inertia");
  d[GEARBOX_IN] = (clutch_torque - gear.torque - drag - NUMBER("gearboxInput", "viscousFriction") * y[GEARBOX_IN]) / NUMBER("gearboxInput", "inertia");
  d[PROP] = (ratio * gear.torque - mesh + r * pump_clutch - half - NUMBER("propShaft", "viscousFriction") * y[PROP]) / NUMBER("propShaft", "inertia");
  d[PUMP] = (pump_torque - pump_clutch - NUMBER("pumpShaft", "viscousFriction") * y[PUMP]) / NUMBER("pumpShaft", "inertia");
  const double resisting = (NUMBER("rearAxle", "dragTorque") + NUMBER("rearAxle", "meshLoss") * fabs(axle_ratio * half)) * soft_sign(y[REAR] / 0.1);
  d[REAR] = (axle_ratio * half - resisting - rear_brake - rear * truck.rear.radius) / NUMBER("rearAxle", "inertia");
  d[FRONT] = (-front_brake - front * truck.front.radius - NUMBER("frontWheels", "viscousFriction") * y[FRONT]) / NUMBER("frontWheels", "inertia");
  return 0;
}

/* ---- what is decided when commands are new (step 0) and at the end of a substep; says whether anything jumped ------------------------------------- */

static int latch(struct relief *r, double pressure) {
  const int was = r->lifted;
  r->lifted = pressure > r->cracking || (was && pressure > r->reseat * r->cracking);
  return r->lifted != was;
}
static int decide(const double *y, double step) {
  int jumped = latch(&truck.main_relief, closed(&truck.high_line, y[HIGH_LINE], y[HIGH_LINE_HEAT]).pressure);
  jumped |= latch(&truck.low_relief, closed(&truck.low_line, y[LOW_LINE], y[LOW_LINE_HEAT]).pressure);
  const double asked = COMMAND("isolationValve.power") > 0.5 ? COMMAND("isolationValve.open") : truck.valve_off;
  truck.valve_waited = asked == truck.valve_accepted ? 0 : truck.valve_waited + step;
  if (asked != truck.valve_accepted && truck.valve_waited >= truck.valve_dead - 0.5 * step)
    truck.valve_accepted = asked, truck.valve_waited = 0, jumped = 1;
  const int wanted = (int)floor(COMMAND("gearbox.gearRequest") + 0.5);
  char name[20] = "reverseRatio";
  if (wanted > 0) snprintf(name, sizeof name, "ratio%d", wanted);
  const double wanted_ratio = wanted == 0 ? 0 : wanted < 0 ? -number("gearbox", name) : number("gearbox", name);
  const double target = wanted_ratio == 0 ? 0 : wanted, was = truck.gear;
  const int locked = truck.locked;
  truck.neutral = was == 0 ? least(truck.neutral + step, 10) : 0;
  if (was == 0 && target != 0 && truck.neutral + 1e-9 >= number("gearbox", "shiftTime") && y[GEAR] < 0.01)
    truck.gear = target, truck.ratio = wanted_ratio, truck.locked = 0;
  else if (was != 0 && was != target) truck.gear = 0, truck.locked = 0;
  else truck.locked = was != 0 && (locked || y[GEAR] > 0.98 * number("gearbox", "lockTorque"));
  return jumped || truck.gear != was || truck.locked != locked;
}

static void set_up(void) {
  oil = (struct fluid){number("fluid", "referenceDensity"), number("fluid", "freeAir"), number("fluid", "numerator"),
      number("fluid", "denominator"), number("fluid", "heatCapacity"), number("fluid", "viscosityIntercept"),
      number("fluid", "viscositySlope")};
  only("pumpMotor", "request", 0), only("pumpMotor", "losses", 0), only("halfShafts", "backlash", 0);
  truck.high = accumulator("highAccumulator"), truck.low = accumulator("lowReservoir");
  truck.high_line = volume("highLine"), truck.low_line = volume("lowLine");
  truck.pump_case = volume("pumpCase"), truck.tank = volume("tank");
  truck.main_relief = relief("mainRelief"), truck.low_relief = relief("lowRelief");
  truck.valve = orifice("isolationValve"), truck.check = orifice("antiCavitation");
  truck.neck = orifice("reservoirNeck"), truck.drain = orifice("caseDrain");
  truck.engine_clutch = friction("engineClutch", "engagementTime");
  truck.disconnect = friction("disconnectClutch", "engagementTime");
  truck.rear_brake = friction("rearBrake", "applicationTime"), truck.front_brake = friction("frontBrake", "applicationTime");
  truck.rear = tyre("rearTyres"), truck.front = tyre("frontTyres");
  truck.disconnect_ratio = number("disconnectClutch", "b");
  truck.valve_opens = number("isolationValve", "opens"), truck.valve_closes = number("isolationValve", "closes");
  truck.valve_dead = number("isolationValve", "deadTime"), truck.valve_lag = number("isolationValve", "lag");
  truck.valve_leak = number("isolationValve", "leak");
  only("isolationValve", "atPowerLoss", 0);
  truck.valve_accepted = number("isolationValve", "accepted"), truck.valve_waited = number("isolationValve", "waited");
  truck.check_cracking = number("antiCavitation", "cracking"), truck.check_over = number("antiCavitation", "opensOver");
  truck.check_lag = number("antiCavitation", "lag");
  truck.gear = number("gearbox", "gear"), truck.ratio = number("gearbox", "ratio");
  truck.neutral = number("gearbox", "neutralTime"), truck.locked = number("gearbox", "locked") > 0.5;
}

static void must(int flag, const char *what) {
  if (flag >= 0) return;
  fprintf(stderr, "truck: %s: CVODE says %d\n", what, flag);
  exit(1);
}

int main(int count, char **words) {
  FILE *in = count == 3 ? fopen(words[1], "r") : NULL, *out = in ? fopen(words[2], "wb") : NULL;
  if (!out) return fprintf(stderr, "truck INPUT OUTPUT\n"), 2;
  char line[256], name[80];
  double value, step = 0;
  int substeps = 0, index;
  while (fgets(line, sizeof line, in) && line[0] != 't') {
    if (sscanf(line, "n %79s %lf", name, &value) == 2) strcpy(numbers[number_count].name, name), numbers[number_count++].value = value;
    else if (sscanf(line, "u %79s", name) == 1) strcpy(commands[command_count++].name, name);
    if (number_count == 4000 || command_count == 400) return fprintf(stderr, "truck: input too long\n"), 2;
  }
  step = number("run", "step"), substeps = (int)number("run", "substeps");
  set_up();
  SUNContext context;
  SUNContext_Create(NULL, &context);
  N_Vector state = N_VNew_Serial(STATES, context), tolerance = N_VNew_Serial(STATES, context);
  double *y = N_VGetArrayPointer(state), *small = N_VGetArrayPointer(tolerance);
  for (int i = 0; i < STATES; i++) {
    y[i] = *find(numbers, number_count, state_names[i]);
    small[i] = 1e-9 * most(fabs(y[i]), 0.1);
  }
  void *solver = CVodeCreate(CV_BDF, context);
  SUNMatrix matrix = SUNDenseMatrix(STATES, STATES, context);
  SUNLinearSolver linear = SUNLinSol_Dense(state, matrix, context);
  must(CVodeInit(solver, rates, 0, state), "start");
  must(CVodeSVtolerances(solver, 1e-9, tolerance), "tolerances");
  must(CVodeSetLinearSolver(solver, linear, matrix), "linear solver");
  must(CVodeSetMaxNumSteps(solver, 200000), "steps");
  long tick = 0;
  int pending = 1;
  /* `line` holds the t of the first tick */
  for (int more = 1; more; tick++) {
    int jumped = pending;
    while ((more = fgets(line, sizeof line, in) != NULL) && line[0] != 't')
      if (sscanf(line, "c %d %lf", &index, &value) == 2 && index < command_count) commands[index].value = value, jumped = 1;
    jumped |= decide(y, 0);
    for (int k = 0; k < substeps; k++) {
      double now = (tick + (double)k / substeps) * step, end = (tick + (k + 1.0) / substeps) * step, reached;
      if (jumped) must(CVodeReInit(solver, now, state), "restart");
      must(CVodeSetStopTime(solver, end), "stop time");
      must(CVode(solver, end, state, &reached, CV_NORMAL), "step");
      jumped = decide(y, step / substeps);
    }
    pending = jumped;
    const struct charge full = charged(&truck.high, y[HIGH_MASS], y[HIGH_GAS]), low = charged(&truck.low, y[LOW_MASS], y[LOW_GAS]);
    const double row[] = {full.pressure, low.pressure, closed(&truck.high_line, y[HIGH_LINE], 0).pressure,
        closed(&truck.low_line, y[LOW_LINE], 0).pressure, closed(&truck.pump_case, y[CASE], 0).pressure,
        full.pressure / full.share, y[PUMP], y[ENGINE], y[PROP], y[REAR], y[SPEED]};
    fwrite(row, sizeof row, 1, out);
  }
  fclose(out);
  return 0;
}
