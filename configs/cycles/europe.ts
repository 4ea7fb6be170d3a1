import { cycle, sequence } from './cycle.js';

const source = 'UN Regulation No. 83, Annex 4a, Appendix 1';

/** Elementary urban cycle (UDC). */
export const ece15 = cycle('ECE-15', source, [
  [0, 0],
  [11, 0],
  [15, 15],
  [23, 15],
  [25, 10],
  [28, 0],
  [49, 0],
  [54, 15],
  [56, 15],
  [61, 32],
  [85, 32],
  [93, 10],
  [96, 0],
  [117, 0],
  [122, 15],
  [124, 15],
  [133, 35],
  [135, 35],
  [143, 50],
  [155, 50],
  [163, 35],
  [176, 35],
  [178, 32],
  [185, 10],
  [188, 0],
  [195, 0],
]);

/** Extra-urban cycle. */
export const eudc = cycle('EUDC', source, [
  [0, 0],
  [20, 0],
  [25, 15],
  [27, 15],
  [36, 35],
  [38, 35],
  [46, 50],
  [48, 50],
  [61, 70],
  [111, 70],
  [119, 50],
  [188, 50],
  [201, 70],
  [251, 70],
  [286, 100],
  [316, 100],
  [336, 120],
  [346, 120],
  [362, 80],
  [370, 50],
  [380, 0],
  [400, 0],
]);

/** Extra-urban cycle for vehicles of low power; breakpoints from memory, only its distance is checked. */
export const eudcLowPower = cycle('EUDC low power', `${source}, from memory`, [
  [0, 0],
  [20, 0],
  [25, 15],
  [27, 15],
  [36, 35],
  [38, 35],
  [46, 50],
  [48, 50],
  [61, 70],
  [111, 70],
  [119, 50],
  [188, 50],
  [201, 70],
  [251, 70],
  [275, 90],
  [358, 90],
  [362, 80],
  [370, 50],
  [380, 0],
  [400, 0],
]);

/** New European driving cycle: four urban cycles and one extra-urban. */
export const nedc = sequence('NEDC', source, [ece15, ece15, ece15, ece15, eudc]);
