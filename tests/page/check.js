/* SPDX-License-Identifier: GPL-3.0-or-later */
/* What a page's own browser says of its layout: put into copies of pages by check_pages.sh; the
 * pages themselves hold no script. Tells its parent a list of complaints. */
(function () {
    "use strict";
    var complaints = [];
    function complain(what, node) {
        if (complaints.length < 20)
            complaints.push(what + ": " + (node ? (node.textContent || node.tagName).slice(0, 60) : ""));
    }
    window.addEventListener("error", function (event) { complain("script error " + event.message); });

    /* colours: WCAG 2.1, relative luminance and contrast ratio */
    function numbers(colour) {
        var found = colour.match(/[\d.]+/g);
        return found && found.length >= 3 ? found.map(Number) : null;
    }
    function luminance(rgb) {
        var linear = rgb.slice(0, 3).map(function (value) {
            value /= 255;
            return value <= 0.04045 ? value / 12.92 : Math.pow((value + 0.055) / 1.055, 2.4);
        });
        return 0.2126 * linear[0] + 0.7152 * linear[1] + 0.0722 * linear[2];
    }
    function contrast(one, other) {
        var a = luminance(one), b = luminance(other);
        return (Math.max(a, b) + 0.05) / (Math.min(a, b) + 0.05);
    }
    function ground(node) {
        for (; node; node = node.parentElement) {
            var colour = numbers(getComputedStyle(node).backgroundColor);
            if (colour && (colour.length < 4 || colour[3] > 0))
                return colour;
        }
        return [255, 255, 255];
    }

    function check_drawing(svg) {
        var frame = svg.getBoundingClientRect();
        var labels = Array.prototype.slice.call(svg.querySelectorAll("text"));
        var boxes = labels.map(function (label) { return label.getBoundingClientRect(); });
        labels.forEach(function (label, i) {
            var box = boxes[i];
            if (box.left < frame.left - 1 || box.right > frame.right + 1 ||
                box.top < frame.top - 1 || box.bottom > frame.bottom + 1)
                complain("label clipped", label);
            var title = label.querySelector("title");
            if (/\u2026/.test(label.lastChild.nodeValue || "") && !(title && title.textContent))
                complain("cut label without its full text", label);
            if (contrast(numbers(getComputedStyle(label).fill), ground(svg)) < 4.5)
                complain("contrast of a label", label);
            for (var j = 0; j < i; j++) {
                var across = Math.min(box.right, boxes[j].right) - Math.max(box.left, boxes[j].left);
                /* letters are lower than the box of their line */
                var down = Math.min(box.bottom, boxes[j].bottom) - Math.max(box.top, boxes[j].top);
                if (across > 1 && down > 0.3 * Math.min(box.height, boxes[j].height))
                    complain("labels overlap, " + labels[j].textContent.slice(0, 30), label);
            }
        });
        if (svg.getAttribute("role") === "img") {
            if (!svg.querySelector("title") || !svg.querySelector("desc") || labels.length === 0)
                complain("drawing without title, description or labels", svg);
        }
    }

    function check_text(node) {
        var box = node.getBoundingClientRect(), style = getComputedStyle(node);
        if (box.right > window.innerWidth + 1 || box.left < -1)
            complain("beyond the edge", node);
        if (node.scrollWidth > node.clientWidth + 1 && style.display !== "inline")
            complain("clipped", node);
        if (node.textContent && contrast(numbers(style.color), ground(node)) < 4.5)
            complain("contrast", node);
    }

    window.addEventListener("load", function () {
        Array.prototype.forEach.call(document.querySelectorAll("details"), function (details) {
            details.open = true;
        });
        if (document.documentElement.scrollWidth > window.innerWidth)
            complain("page wider than its window");
        Array.prototype.forEach.call(document.querySelectorAll("svg"), check_drawing);
        Array.prototype.forEach.call(
            document.querySelectorAll("h1,h2,h3,p,li,td,th,a,span,summary,figcaption,footer"),
            check_text);
        if (document.querySelectorAll("script").length !== 1)
            complain("scripts besides this one");
        if (document.querySelectorAll("img,iframe,object,embed,link,form,base").length !== 0)
            complain("elements that load");
        if (/^run/.test(document.title))
            complain("a label's script ran");
        if (performance.getEntriesByType("resource").length !== 0)
            complain("requests");
        window.parent.postMessage([window.name, document.querySelectorAll("svg[role]").length,
                                   complaints.join("; ")].join("\t"), "*");
    });
})();
