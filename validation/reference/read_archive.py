"""Reads an Epiloom archive with nothing but the Python standard library.

Written from scripting/FORMAT.md alone, as a check that the page is enough. Not fast: the BLAKE3 hash below
(from its specification: O'Connor, Aumasson, Neves, Wilcox-O'Hearn, 2020) is plain Python.

    python3 read_archive.py FILE [--bits]

prints the run, every snapshot and every point of the sweeps as JSON; with --bits also every number of a snapshot
or point as 16 hexadecimal digits of its IEEE 754 form, in a fixed order. Exits with 1 when anything in the file is damaged.
"""

import json
import struct
import sys

MASK = 0xFFFFFFFF
INITIAL = (0x6A09E667, 0xBB67AE85, 0x3C6EF372, 0xA54FF53A, 0x510E527F, 0x9B05688C, 0x1F83D9AB, 0x5BE0CD19)
PERMUTED = (2, 6, 3, 10, 7, 0, 4, 13, 1, 11, 12, 5, 9, 14, 15, 8)
QUARTERS = ((0, 4, 8, 12), (1, 5, 9, 13), (2, 6, 10, 14), (3, 7, 11, 15),
            (0, 5, 10, 15), (1, 6, 11, 12), (2, 7, 8, 13), (3, 4, 9, 14))
CHUNK_START, CHUNK_END, PARENT, ROOT = 1, 2, 4, 8


def compress(chaining, words, counter, length, flags):
    state = list(chaining) + list(INITIAL[:4]) + [counter & MASK, counter >> 32, length, flags]
    words = list(words)
    for turn in range(7):
        for place, (a, b, c, d) in enumerate(QUARTERS):
            for word, first, second in ((words[2 * place], 16, 12), (words[2 * place + 1], 8, 7)):
                state[a] = (state[a] + state[b] + word) & MASK
                state[d] ^= state[a]
                state[d] = (state[d] >> first | state[d] << (32 - first)) & MASK
                state[c] = (state[c] + state[d]) & MASK
                state[b] ^= state[c]
                state[b] = (state[b] >> second | state[b] << (32 - second)) & MASK
        words = [words[place] for place in PERMUTED]
    return [state[i] ^ state[i + 8] for i in range(8)]


def chunk(data, counter, root):
    chaining = INITIAL
    blocks = [data[i:i + 64] for i in range(0, len(data), 64)] or [b""]
    for place, block in enumerate(blocks):
        flags = (CHUNK_START if place == 0 else 0) | ((CHUNK_END | root) if place == len(blocks) - 1 else 0)
        words = struct.unpack("<16I", block.ljust(64, b"\0"))
        chaining = compress(chaining, words, counter, len(block), flags)
    return chaining


def tree(data, counter, root):
    if len(data) <= 1024:
        return chunk(data, counter, root)
    chunks = (len(data) - 1) // 1024
    left = 1 << (chunks.bit_length() - 1)
    words = tree(data[:left * 1024], counter, 0) + tree(data[left * 1024:], counter + left, 0)
    return compress(INITIAL, words, 0, 64, PARENT | root)


def digest(data):
    return struct.pack("<8I", *tree(data, 0, ROOT))[:16]


class Damaged(Exception):
    pass


def padded(length):
    return (length + 7) // 8 * 8


class Payload:
    """Takes values off the front of a payload."""

    def __init__(self, data):
        self.data, self.at = data, 0

    def take(self, count):
        if count > len(self.data) - self.at:
            raise Damaged("damaged: a payload ends too early")
        self.at += count
        return self.data[self.at - count:self.at]

    def u32(self):
        return struct.unpack("<I", self.take(4))[0]

    def u64(self):
        return struct.unpack("<Q", self.take(8))[0]

    def f64(self):
        return struct.unpack("<d", self.take(8))[0]

    def flag(self):
        return {b"\0": False, b"\1": True}[self.take(1)]

    def text(self):
        return self.take(self.u64()).decode("utf-8")

    def list_of(self, read):
        return [read() for _ in range(self.u64())]

    def map_to(self, read):
        return dict((self.text(), read()) for _ in range(self.u64()))

    def optional(self, read):
        return read() if self.flag() else None

    def record(self, **fields):
        return {name: read() for name, read in fields.items()}

    def value(self):
        tag = self.u32()
        if tag == 0:
            return self.record(value=self.f64, unit=self.text)
        return {1: self.text, 2: self.flag}[tag]()

    def status(self):
        return {0: lambda: "solved", 1: lambda: self.record(failed=self.text)}[self.u32()]()

    def condition(self):
        return self.record(name=self.text, value=self.value)

    def conditions(self):
        return self.list_of(self.condition)

    def input(self):
        return self.record(default=self.value, used=self.value, overridden=self.flag)

    def data_file(self):
        return self.record(blake3=self.text, length=self.u64)

    def run(self):
        return self.record(
            program_version=self.text, script_name=self.text, script_text=self.text,
            inputs=lambda: self.map_to(self.input), data_files=lambda: self.map_to(self.data_file),
            tolerances=self.conditions)

    def order(self):
        return self.record(step=self.u64, point=self.u64)

    def label(self):
        return self.record(name=self.text, kind=self.text, order=self.order, status=self.status)

    def mesh(self):
        return self.record(nodes=self.u64, value=self.f64)

    def figure(self):
        return self.record(
            name=self.text, value=lambda: self.optional(self.f64), error=lambda: self.optional(self.f64),
            unit=self.text, reason=lambda: self.optional(self.text), meshes=lambda: self.list_of(self.mesh))

    def column(self):
        return self.record(name=self.text, unit=self.text)

    def table(self):
        return self.record(name=self.text, rows=self.u64, columns=lambda: self.list_of(self.column))

    def line(self):
        return self.record(
            group=self.text, label=self.text, value=lambda: self.optional(self.f64), unit=self.text,
            share=lambda: self.optional(self.f64), note=self.text)

    def ledger(self):
        return self.record(title=self.text, lines=lambda: self.list_of(self.line))

    def layer(self):
        return self.record(
            name=self.text, material=self.text, thickness=self.value, doping=self.text,
            settings=self.conditions)

    def stack(self):
        return self.record(
            name=self.text, layers=lambda: self.list_of(self.layer), settings=self.conditions)

    def material(self):
        return self.record(
            layer=self.text, material=self.text, parameter=self.text, value=self.value,
            source=self.text, note=self.text)

    def snapshot(self):
        return self.record(
            label=self.label, conditions=self.conditions, figures=lambda: self.list_of(self.figure),
            tables=lambda: self.list_of(self.table), ledgers=lambda: self.list_of(self.ledger),
            stack=self.stack, materials=lambda: self.list_of(self.material),
            warnings=lambda: self.list_of(self.text))

    def entry(self):
        return self.record(
            label=self.label, offset=self.u64, length=self.u64, header_digest=lambda: self.take(16))

    def sweep_place(self):
        return self.record(
            name=self.text, step=self.u64, offset=self.u64, length=self.u64,
            header_digest=lambda: self.take(16), blocks=lambda: self.list_of(self.block_place))

    def block_place(self):
        return self.record(
            first=self.u64, last=self.u64, count=self.u64, failed=self.u64, offset=self.u64,
            length=self.u64, header_digest=lambda: self.take(16))

    def index(self):
        return self.record(
            entries=lambda: self.list_of(self.entry), sweeps=lambda: self.list_of(self.sweep_place))

    def sweep_column(self):
        return self.record(name=self.text, unit=self.text)

    def sweep_start(self):
        return self.record(
            name=self.text, step=self.u64, points=self.u64, plan=self.text,
            coordinates=lambda: self.list_of(self.sweep_column))

    def share(self):
        return self.record(number=self.u64, of=self.u64)

    def sweep(self):
        return self.record(
            start=self.sweep_start, share=lambda: self.optional(self.share), run=lambda: self.take(16),
            left_out=lambda: self.optional(self.u64))

    def block_label(self):
        return self.record(
            sweep=self.text, step=self.u64, first=self.u64, last=self.u64, count=self.u64, failed=self.u64)

    def point_column(self):
        return self.record(
            name=self.text, unit=self.text, cells=lambda: self.take(self.u64()), values=self.flag,
            errors=self.flag, texts=lambda: self.list_of(self.u32))

    def row_texts(self):
        return self.record(row=self.u32, texts=lambda: self.list_of(self.u32))

    def row_snapshot(self):
        return self.record(
            row=self.u32, label=self.label, offset=self.u64, length=self.u64,
            header_digest=lambda: self.take(16))

    def block(self):
        return self.record(
            label=self.block_label, indices=lambda: self.list_of(self.u64),
            coordinates=lambda: self.list_of(self.point_column),
            outputs=lambda: self.list_of(self.point_column), texts=lambda: self.list_of(self.text),
            failed=lambda: self.list_of(self.row_texts), printed=lambda: self.list_of(self.row_texts),
            warnings=lambda: self.list_of(self.row_texts),
            snapshots=lambda: self.list_of(self.row_snapshot))

    def whole(self, read):
        value = read()
        if self.at != len(self.data):
            raise Damaged("damaged: bytes are left over after a payload")
        return value


HEADER = struct.Struct("<8sHHIQQQ16s16s16s16s")
FOOTER = struct.Struct("<8sQQQ16s16s")


def read_frame(data, at):
    """Kind, number, run, label bytes, payload bytes, number block, header digest and end of a frame."""
    if len(data) - at < HEADER.size:
        raise Damaged(f"damaged or cut off: no whole frame at byte {at}")
    magic, kind, schema, label, payload, numbers, ordinal, run, label_sum, body_sum, own = \
        HEADER.unpack_from(data, at)
    if magic != b"\xE7frame\r\n" or digest(data[at:at + HEADER.size - 16]) != own:
        raise Damaged(f"damaged: no frame header at byte {at}")
    known = {3: 2}.get(kind, 1)
    if schema != known:
        raise Damaged(f"a frame of kind {kind} has schema {schema}; this reader knows {known}")
    body = at + HEADER.size + padded(label)
    block = body + padded(payload)
    end = block + 8 * numbers
    if end > len(data):
        raise Damaged(f"cut off: the frame at byte {at} is not whole")
    if digest(data[at + HEADER.size:body]) != label_sum or digest(data[body:end]) != body_sum:
        raise Damaged(f"damaged: the frame at byte {at}")
    label_bytes = data[at + HEADER.size:at + HEADER.size + label]
    return kind, ordinal, run, label_bytes, data[body:body + payload], data[block:end], own, end


def read_snapshot(label, payload, numbers):
    label = (lambda taken: taken.whole(taken.label))(Payload(label))
    taken = Payload(payload)
    snapshot = taken.whole(taken.snapshot)
    if snapshot["label"] != label:
        raise Damaged("damaged: a label differs from its snapshot")
    at = 0
    for table in snapshot["tables"]:
        for column in table["columns"]:
            column["values"] = list(struct.unpack_from(f"<{table['rows']}d", numbers, at))
            at += 8 * table["rows"]
    if at != len(numbers):
        raise Damaged("damaged: a number block has another length than its tables")
    return snapshot


def read_block(label, payload, numbers):
    """The label of a block and its points, each with the places of its snapshots."""
    label = (lambda taken: taken.whole(taken.block_label))(Payload(label))
    taken = Payload(payload)
    block = taken.whole(taken.block)
    rows = len(block["indices"])
    if block["label"] != label or label["count"] != rows or label["failed"] != len(block["failed"]):
        raise Damaged("damaged: a label differs from its block")
    if (label["first"], label["last"]) != (block["indices"][0], block["indices"][-1]):
        raise Damaged("damaged: a label differs from its block")
    points = [
        {"index": index, "coordinates": [], "outputs": [], "failed": None, "printed": [], "warnings": [],
         "snapshots": []} for index in block["indices"]]
    at = 0
    for into, columns in (("coordinates", block["coordinates"]), ("outputs", block["outputs"])):
        for column in columns:
            values = errors = None
            if column["values"]:
                values, at = struct.unpack_from(f"<{rows}d", numbers, at), at + 8 * rows
            if column["errors"]:
                errors, at = struct.unpack_from(f"<{rows}d", numbers, at), at + 8 * rows
            texts = iter(column["texts"])
            for row, tag in enumerate(column["cells"]):
                cell = {"name": column["name"], "unit": column["unit"]}
                if tag in (1, 2):
                    cell["value"] = values[row]
                    if tag == 2:
                        cell["error"] = errors[row]
                elif tag in (3, 6):
                    cell["text" if tag == 3 else "absent"] = block["texts"][next(texts)]
                elif tag in (4, 5):
                    cell["flag"] = tag == 5
                if tag:
                    points[row][into].append(cell)
    if at != len(numbers):
        raise Damaged("damaged: a number block has another length than its columns")
    for failed in block["failed"]:
        points[failed["row"]]["failed"] = block["texts"][failed["texts"][0]]
    for what in ("printed", "warnings"):
        for each in block[what]:
            points[each["row"]][what] = [block["texts"][text] for text in each["texts"]]
    for each in block["snapshots"]:
        points[each["row"]]["snapshots"].append((each["label"], each["offset"], each["length"], each["header_digest"]))
    return label, points


def read_archive(data):
    """The run, the snapshots and the sweeps in order, and whether the file is finished."""
    if data[:8] != b"\xE7piloom\x1A":
        raise Damaged("not an Epiloom archive")
    if len(data) < 32 or digest(data[:16]) != data[16:32]:
        raise Damaged("damaged: the start of the file")
    if struct.unpack_from("<I", data, 8)[0] != 1:
        raise Damaged("a later container version")
    run, snapshots, first, index_at = None, [], None, None
    end = len(data)
    footer = None
    if len(data) >= 32 + FOOTER.size:
        magic, index, length, count, index_sum, own = FOOTER.unpack_from(data, len(data) - FOOTER.size)
        if magic == b"\xE7whole\r\n" and digest(data[-FOOTER.size:-16]) == own and length == len(data):
            footer, end = (index, count, index_sum), len(data) - FOOTER.size
    at, expected, places = 32, 0, []
    sweeps, waiting = {}, {}
    while at < end:
        kind, ordinal, of, label, payload, numbers, own, after = read_frame(data[:end], at)
        if first is None:
            first = digest(data[at + HEADER.size:after])
        if ordinal != expected or of != first:
            raise Damaged(f"damaged: the frame at byte {at} is out of place")
        taken = Payload(payload)
        if kind == 1:
            run = taken.whole(taken.run)
        elif kind == 2:
            snapshot = read_snapshot(label, payload, numbers)
            place = (snapshot["label"], at, after - at, own)
            name, order = snapshot["label"]["name"], snapshot["label"]["order"]
            parent = [each for each in sweeps.values()
                      if each["step"] == order["step"] and name.startswith(f"{each['name']}/{order['point']}/")]
            if parent:
                waiting[at] = (place, snapshot)
            else:
                snapshots.append(snapshot)
                places.append(place)
        elif kind == 4:
            record = taken.whole(taken.sweep)
            start = record["start"]
            known = sweeps.get(start["name"])
            if known is None or (known["start"], known["share"], known["run"]) != (
                    start, record["share"], record["run"]):
                known = {"name": start["name"], "step": start["step"], "points": {}, "blocks": [],
                         "place": (at, after - at, own)}
            sweeps[start["name"]] = {**known, **record}
        elif kind == 5:
            block_label, points = read_block(label, payload, numbers)
            sweep = sweeps[block_label["sweep"]]
            for point in points:
                for place in point["snapshots"]:
                    if waiting.get(place[1], (None,))[0] != place:
                        raise Damaged("damaged: a point names a snapshot that is not there")
                point["snapshots"] = [waiting[place[1]][1] for place in point["snapshots"]]
                sweep["points"][point["index"]] = point
            waiting = {}
            sweep["blocks"].append((*(block_label[key] for key in ("first", "last", "count", "failed")),
                                    at, after - at, own))
        elif kind == 3:
            index = taken.whole(taken.index)
            listed = [(each["label"], each["offset"], each["length"], each["header_digest"])
                      for each in index["entries"]]
            if footer != (at, len(listed), own) or listed != places:
                raise Damaged("damaged: the index")
            listed = [(each["name"], each["step"], (each["offset"], each["length"], each["header_digest"]),
                       [tuple(block.values()) for block in each["blocks"]]) for each in index["sweeps"]]
            if listed != [(each["name"], each["step"], each["place"], each["blocks"]) for each in sweeps.values()]:
                raise Damaged("damaged: the index of the sweeps")
            index_at = at
        else:
            raise Damaged(f"a later kind of frame: {kind}")
        at, expected = after, expected + 1
    finished = footer is not None and index_at is not None
    if not finished:
        snapshots.sort(key=lambda each: (each["label"]["order"]["step"], each["label"]["order"]["point"],
                                         each["label"]["name"].encode()))
    listed = [
        {"start": each["start"], "share": each["share"], "left_out": each["left_out"],
         "points": [each["points"][index] for index in sorted(each["points"])]}
        for each in sorted(sweeps.values(), key=lambda each: each["step"])]
    return run, snapshots, listed, finished


def point_bits(point):
    numbers = []
    for cell in point["coordinates"] + point["outputs"]:
        numbers += [cell[key] for key in ("value", "error") if key in cell]
    return [struct.pack(">d", number).hex() for number in numbers]


def bits(snapshot):
    numbers = []
    for figure in snapshot["figures"]:
        numbers += [number for number in (figure["value"], figure["error"]) if number is not None]
        numbers += [mesh["value"] for mesh in figure["meshes"]]
    for table in snapshot["tables"]:
        for column in table["columns"]:
            numbers += column["values"]
    for ledger in snapshot["ledgers"]:
        for line in ledger["lines"]:
            numbers += [number for number in (line["value"], line["share"]) if number is not None]
    for material in snapshot["materials"]:
        if isinstance(material["value"], dict):
            numbers.append(material["value"]["value"])
    return [struct.pack(">d", number).hex() for number in numbers]


def plain(value):
    """Numbers that JSON cannot hold as text."""
    if isinstance(value, dict):
        return {key: plain(each) for key, each in value.items()}
    if isinstance(value, list):
        return [plain(each) for each in value]
    if isinstance(value, float) and (value != value or value in (float("inf"), float("-inf"))):
        return str(value)
    return value


def main(arguments):
    with open(arguments[0], "rb") as file:
        data = file.read()
    try:
        run, snapshots, sweeps, finished = read_archive(data)
    except Damaged as error:
        sys.exit(str(error))
    if "--bits" in arguments[1:]:
        for snapshot in snapshots:
            snapshot["bits"] = bits(snapshot)
        for point in (point for sweep in sweeps for point in sweep["points"]):
            point["bits"] = point_bits(point)
            for snapshot in point["snapshots"]:
                snapshot["bits"] = bits(snapshot)
    whole = {"run": run, "snapshots": snapshots, "sweeps": sweeps, "finished": finished}
    json.dump(plain(whole), sys.stdout, indent=1)
    print()


if __name__ == "__main__":
    main(sys.argv[1:])
