// Move the loupe's frame to its box, and the loupe out of the target's way.
const {left, right, bottom, top, side} = box.data
const place = document.querySelector(".loupe")
if (place) place.hidden = !left.length
if (!left.length) return
x_range.setv({start: left[0], end: right[0]}, {sync: false})
y_range.setv({start: bottom[0], end: top[0]}, {sync: false})
if (place) place.dataset.side = side[0]
