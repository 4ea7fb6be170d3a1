/** All instruments of the plant library, one line each. */
export { driver } from './instruments/driver.js';
export { powerStage } from './instruments/power-stage.js';
export {
  anySensor,
  positionSensor,
  pressureSensor,
  speedSensor,
  temperatureSensor,
  torqueSensor,
  velocitySensor,
} from './instruments/sensor.js';
export {
  currentInput,
  currentOutput,
  dutyInput,
  dutyOutput,
  frequencyInput,
  frequencyOutput,
  voltageInput,
  voltageOutput,
} from './instruments/terminal.js';
