// A handle over a figure. Its place is kept in data coordinates; the frame of the figure has
// fixed borders, so pixels follow from the figure's ranges.

export function render({model, el}) {
  const root = document.createElement("div")
  root.className = "area"
  root.innerHTML = `
    <i class="ghost" hidden></i>
    <b class="tag across" hidden></b><b class="tag up" hidden></b>
    <div class="knob" tabindex="0" role="slider" hidden><svg viewBox="-24 -24 48 48" aria-hidden="true">
      <path d="M0-23l4 5h-8zM0 23l4-5h-8zM-23 0l5-4v8zM23 0l-5-4v8z"/></svg><i></i></div>`
  el.appendChild(root)
  const $ = (selector) => root.querySelector(selector)
  const knob = $(".knob")
  knob.setAttribute("aria-label", model.label)

  let figure, source
  let x = null, y = null
  let held = null  // where the hand took it: place, and pointer relative to the knob
  const [top, bottom, left, right] = model.borders
  const [x_low, x_high, y_low, y_high] = model.bounds
  const within = (v, low, high) => Math.min(high, Math.max(low, v))
  const text = (v) => v >= 0.01 || v === 0 ? v.toFixed(3).replace(/0$/, "") : v.toPrecision(2)

  const size = () => [root.clientWidth - left - right, root.clientHeight - top - bottom]
  const at = (px, py) => {
    const {x_range, y_range} = figure
    const [width, height] = size()
    return [
      left + (px - x_range.start) / (x_range.end - x_range.start) * width,
      top + (y_range.end - py) / (y_range.end - y_range.start) * height,
    ]
  }
  const put = (element, place) => {
    element.style.transform = `translate(${place[0]}px, ${place[1]}px)`
  }
  const paint = () => {
    knob.hidden = x === null
    if (x === null) return
    const place = at(x, y)
    put(knob, place)
    put($(".across"), [place[0], top + size()[1]])
    put($(".up"), [left, place[1]])
    $(".across").textContent = text(x)
    $(".up").textContent = text(y)
    knob.setAttribute("aria-valuenow", String(x))
    knob.setAttribute("aria-valuetext", `${model.names[0]} ${text(x)}, ${model.names[1]} ${text(y)}`)
    const tags = held !== null || root.classList.contains("keys")
    for (const tag of root.querySelectorAll(".tag")) tag.hidden = !tags
  }
  const move = (to_x, to_y) => {
    x = within(to_x, x_low, x_high)
    y = within(to_y, y_low, y_high)
    paint()
    model.send_msg({x, y})
  }

  knob.addEventListener("pointerdown", (event) => {
    if (event.button !== 0) return
    const box = root.getBoundingClientRect()
    const place = at(x, y)
    held = {x, y, dx: event.clientX - box.left - place[0], dy: event.clientY - box.top - place[1]}
    knob.setPointerCapture(event.pointerId)
    knob.focus({preventScroll: true})  // Escape takes the move back
    put($(".ghost"), place)
    $(".ghost").hidden = false
    root.classList.add("held")
    model.send_msg({held: true})
    paint()
  })
  knob.addEventListener("pointermove", (event) => {
    if (held === null) return
    const {x_range, y_range} = figure
    const box = root.getBoundingClientRect()
    const [width, height] = size()
    const across = within((event.clientX - box.left - held.dx - left) / width, 0, 1)
    const up = within(1 - (event.clientY - box.top - held.dy - top) / height, 0, 1)
    move(
      x_range.start + across * (x_range.end - x_range.start),
      y_range.start + up * (y_range.end - y_range.start),
    )
  })
  const release = () => {
    if (held === null) return
    held = null
    root.classList.remove("held")
    $(".ghost").hidden = true
    model.send_msg({held: false})
    settle()
    paint()
  }
  // Where a hand lets go of it, it rests on a whole step.
  const rest = () => {
    const {step} = model
    if (held !== null && step) move(digits(Math.round(x / step) * step), digits(Math.round(y / step) * step))
    release()
  }
  // Answers to earlier moves may still come; until they have, its own place counts.
  let quiet = 0
  const settle = () => {
    quiet = performance.now() + 300
    setTimeout(take, 310)
  }
  knob.addEventListener("pointerup", rest)
  knob.addEventListener("pointercancel", rest)

  // Arrows move by a hundredth of the plane, with Shift by a tenth of that.
  const keys = {ArrowRight: [1, 0], ArrowLeft: [-1, 0], ArrowUp: [0, 1], ArrowDown: [0, -1]}
  const digits = (v) => Number(v.toFixed(6))
  knob.addEventListener("keydown", (event) => {
    if (event.key === "Escape" && held !== null) {
      move(held.x, held.y)
      return release()
    }
    if (!(event.key in keys) || event.altKey || event.ctrlKey || event.metaKey) return
    const [right_, up_] = keys[event.key]
    const part = event.shiftKey ? 0.001 : 0.01
    const {x_range, y_range} = figure
    move(
      digits(x + right_ * part * (x_range.end - x_range.start)),
      digits(y + up_ * part * (y_range.end - y_range.start)),
    )
    settle()
    event.preventDefault()
  })
  knob.addEventListener("focus", () => {
    root.classList.toggle("keys", knob.matches(":focus-visible"))
    if (x !== null) paint()
  })
  knob.addEventListener("blur", () => { root.classList.remove("keys"); paint() })

  const take = () => {
    if (held !== null || performance.now() < quiet) return
    const {x: xs, y: ys} = source.data
    x = xs.length ? xs[0] : null
    y = ys.length ? ys[0] : null
    paint()
  }
  const start = setInterval(() => {
    const doc = window.Bokeh?.documents?.[0]
    figure = doc?.get_model_by_name(model.figure)
    source = doc?.get_model_by_name(model.source)
    if (!figure || !source) return
    clearInterval(start)
    source.properties.data.change.connect(take)
    for (const range of [figure.x_range, figure.y_range]) range.change.connect(paint)
    new ResizeObserver(paint).observe(root)
    take()
  }, 50)
}
