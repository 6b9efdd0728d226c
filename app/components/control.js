// One quantity: a number field and a slider; or a pair: a count, the same as a ratio, one slider.
// Typed text goes to Python as it is and is checked there; the slider sends numbers.

const GROUP = "\u202f"
const SPAN = 1000

const scales = {
  linear: {to: (v) => v, from: (s) => s},
  log: {to: Math.log, from: Math.exp},
  "cube root": {to: Math.cbrt, from: (s) => s * s * s},
}

export function render({model, el}) {
  const scale = scales[model.scale]
  const root = document.createElement("div")
  root.className = model.per_label ? "box pair" : "box"
  const id = model.field
  root.innerHTML = `
    <div class="fields">
      <label class="name" for="${id}"></label>
      <span class="hint"></span>
      <input id="${id}" class="number" type="text" inputmode="decimal" autocomplete="off" spellcheck="false">
      <span class="equals" aria-hidden="true">=</span>
      <label class="name per" for="${id}-per"></label>
      <input id="${id}-per" class="number per" type="text" inputmode="decimal" autocomplete="off" spellcheck="false">
    </div>
    <div class="track">
      <input class="slider" type="range" min="0" max="${SPAN}" step="any">
      <span class="tick" aria-hidden="true"></span>
    </div>
    <p class="error" role="alert"></p>`
  const $ = (selector) => root.querySelector(selector)
  const number = $(".number:not(.per)")
  const ratio = $(".number.per")
  const slider = $(".slider")
  $(".name:not(.per)").textContent = model.label
  $(".name.per").textContent = model.per_label
  $(".hint").textContent = model.hint
  root.title = model.meaning
  number.setAttribute("aria-description", model.meaning)
  slider.setAttribute("aria-label", `${model.label} ${model.hint}`.trim())

  const clamp = (v) => Math.min(model.high, Math.max(model.low, v))
  const place = (v) => {
    const [a, b] = [scale.to(model.low), scale.to(model.high)]
    return SPAN * (scale.to(clamp(v)) - a) / (b - a)
  }
  const at = (position) => {
    const [a, b] = [scale.to(model.low), scale.to(model.high)]
    return scale.from(a + position / SPAN * (b - a))
  }
  const tidy = (v, step) => {
    if (model.whole) return Math.round(clamp(v))
    return clamp(Number((Math.round(v / step) * step).toFixed(6)))
  }
  const shown = (v) => {
    if (v === null) return ""
    if (model.whole) return String(v).replace(/\B(?=(\d{3})+$)/g, GROUP)
    const short = v.toFixed(model.digits)
    return Number(short) === v ? short : String(Number(v.toPrecision(6)))
  }
  const shown_ratio = (v) => {
    if (v === null || !model.per) return ""
    const share = v / model.per
    return share >= 0.01 ? share.toFixed(3) : String(Number(share.toPrecision(3)))
  }

  let value = model.value
  const typing = new Set()
  const paint = () => {
    const text = shown(value)
    // An answer to an earlier change must not wipe out what is being typed.
    if (!typing.has(number)) number.value = text
    if (!typing.has(ratio)) ratio.value = shown_ratio(value)
    slider.disabled = value === null
    const position = value === null ? 0 : place(value)
    slider.value = position
    slider.style.setProperty("--fill", `${position / SPAN * 100}%`)
    const share = shown_ratio(value)
    slider.setAttribute("aria-valuetext", share ? `${text}, ratio ${share}` : text)
    const tick = $(".tick")
    const inside = model.tick !== null && model.tick > model.low && model.tick < model.high
    tick.hidden = !inside
    if (inside) tick.style.setProperty("--at", place(model.tick) / SPAN)
  }
  // Answers to earlier steps are late: until they have come, the slider's own value counts.
  let quiet = 0
  const send = (v) => {
    value = v
    paint()
    quiet = performance.now() + 300
    setTimeout(refresh, 310)
    model.send_msg({field: id, value: v})
  }

  slider.addEventListener("input", () => send(tidy(at(Number(slider.value)), model.step)))

  // Arrows move by the step, with Shift by a tenth of it; on a log scale by 2 percent.
  const moved = (direction, factor, fine) => {
    if (model.scale === "linear") {
      const step = fine ? model.step / 10 : model.step
      return tidy(value + direction * factor * step, step)
    }
    const next = tidy(at(place(value) + direction * factor * (fine ? 0.5 : 4)), model.step)
    if (!model.whole || next !== value) return next
    return clamp(value + direction)
  }
  const keys = {
    ArrowRight: [1, 1], ArrowUp: [1, 1], ArrowLeft: [-1, 1], ArrowDown: [-1, 1],
    PageUp: [1, 10], PageDown: [-1, 10],
  }
  slider.addEventListener("keydown", (event) => {
    if (value === null || event.altKey || event.ctrlKey || event.metaKey) return
    if (event.key in keys) send(moved(...keys[event.key], event.shiftKey))
    else if (event.key === "Home") send(tidy(model.low, model.step))
    else if (event.key === "End") send(tidy(model.high, model.step))
    else return
    event.preventDefault()
  })

  // A field speaks when it is left or Enter is pressed; Escape takes the text back.
  const listen = (input, field) => {
    let before = ""
    const speak = () => {
      typing.delete(input)
      if (input.value === before) return
      before = input.value
      model.send_msg({field, text: input.value})
    }
    input.addEventListener("input", () => typing.add(input))
    input.addEventListener("focus", () => { before = input.value; input.select() })
    input.addEventListener("change", speak)
    input.addEventListener("keydown", (event) => {
      if (event.key === "Enter") speak()
      if (event.key === "Escape") { typing.delete(input); paint(); before = input.value }
    })
  }
  listen(number, id)
  listen(ratio, model.per_field)

  const complain = () => {
    $(".error").textContent = model.error
    root.classList.toggle("wrong", model.error !== "")
    const wrong = model.error_field === model.per_field && model.per_field ? ratio : number
    for (const input of [number, ratio]) {
      input.setAttribute("aria-invalid", String(model.error !== "" && input === wrong))
    }
  }
  const refresh = () => {
    if (performance.now() < quiet) return
    value = model.value
    paint()
  }
  model.on("value", refresh)
  model.on("per", paint)
  model.on("tick", paint)
  model.on("low", paint)
  model.on("high", paint)
  model.on("accepted", refresh)
  model.on(["error", "error_field"], complain)
  el.appendChild(root)
  paint()
  complain()
}
