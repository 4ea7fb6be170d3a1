/** All elements of the plant library, one line each, sorted by name. */
export { axle } from './axle.js';
export { clutch } from './clutch.js';
export { combustionEngine } from './combustion-engine.js';
export { compliantShaft } from './compliant-shaft.js';
export { differential } from './differential.js';
export { forceSource } from './force-source.js';
export { inertia } from './inertia.js';
export { planetaryJoint } from './planetary-joint.js';
export { serviceBrake } from './service-brake.js';
export { shaftDrag } from './shaft-drag.js';
export { speedSource } from './speed-source.js';
export { steppedGearbox } from './stepped-gearbox.js';
export { torqueSource } from './torque-source.js';
export { tyre } from './tyre.js';
export { vehicle } from './vehicle.js';
export { velocitySource } from './velocity-source.js';
