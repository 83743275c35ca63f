/**
 * Mean and upward mean of wealth over every household's ties, and mixes with one of them, in AssemblyScript:
 * model/row-statistic.ts says what they are. Same operations in the same order, so the same bits. The wealth of everyone and the targets of all ties lie in
 * this module's memory, without bounds checks and addressed directly, which is where the time goes.
 */

/**
 * OUT[i] = scale·(selfWeight·own + common + weight·mean), for households whose row is START[i] … START[i+1] − 1; `own` is
 * the address of the first one's wealth.
 */
export function means(
  upward: bool,
  count: i32,
  start: usize,
  target: usize,
  wealth: usize,
  own: usize,
  out: usize,
  scale: f64,
  selfWeight: f64,
  common: f64,
  weight: f64,
): void {
  let e = target + (<usize>load<u32>(start) << 2);
  for (let i = 0; i < count; i++) {
    const from = e;
    const end = target + (<usize>load<u32>(start + (<usize>i << 2), 4) << 2);
    const mine = load<f64>(own + (<usize>i << 3));
    let sum: f64 = 0;
    let mean = mine;
    if (upward) {
      let richer: i32 = 0;
      for (; e < end; e += 4) {
        const other = load<f64>(wealth + (<usize>load<u32>(e) << 3));
        const above = other > mine;
        // a mask, not a branch: which neighbours are richer cannot be predicted
        sum += reinterpret<f64>(reinterpret<i64>(other) & -(<i64>above));
        richer += <i32>above;
      }
      if (richer > 0) mean = sum / <f64>richer;
    } else {
      for (; e < end; e += 4) sum += load<f64>(wealth + (<usize>load<u32>(e) << 3));
      if (end > from) mean = sum / <f64>((end - from) >> 2);
    }
    store<f64>(out + (<usize>i << 3), scale * (selfWeight * mine + common + weight * mean));
  }
}
