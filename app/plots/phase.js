// Lines at the pointer, and the power limit of the study there: u* = 1 - (1 - delta)(eps - eps*)
// / (eps (1 - eps*)), with eps* read off the transition line.
const {ratio, sparsity} = transition.data
const [delta, eps] = [cb_obj.x, cb_obj.y]
const inside = delta > 0 && delta <= x_range.end && eps > 0 && eps <= y_range.end
const silent = {sync: false}
upright.setv({location: delta, visible: inside}, silent)
level.setv({location: eps, visible: inside}, silent)
if (!inside) {
  words.setv({data: {x: [], y: [], text: [], dx: [], dy: [], align: []}}, silent)
  return
}
let limit = 1
if (delta < 1) {
  let i = 0
  while (i < ratio.length - 2 && ratio[i + 1] <= delta) i += 1
  const part = (delta - ratio[i]) / (ratio[i + 1] - ratio[i])
  const critical = sparsity[i] + part * (sparsity[i + 1] - sparsity[i])
  if (eps > critical) limit = 1 - (1 - delta) * (eps - critical) / (eps * (1 - critical))
}
const short = (v) => v >= 0.01 ? v.toFixed(2) : v.toPrecision(1)
const told = limit < 1 ? `power limit ${limit.toFixed(2)}` : "no power limit"
const right = delta > 0.55 * x_range.end
words.setv({data: {
  x: [delta], y: [eps], text: [`${short(delta)}, ${short(eps)}: ${told}`],
  dx: [right ? -10 : 10], dy: [eps > 0.9 * y_range.end ? 14 : -12], align: [right ? "right" : "left"],
}}, silent)
