#!/usr/bin/env python3
"""The same network in Stillgate and in SimPy, a general-purpose discrete-event library for Python.

    python3 -m venv target/simpy && target/simpy/bin/pip install simpy
    cargo build --release
    target/simpy/bin/python scripts/compare-simpy.py

Rings of three inverting gates, tied together by XORs, with fixed delays drawn here, let go at 100 ps and stopped later. Both
must give the same transitions: every net, every time, to the femtosecond. Then both are timed: SimPy by its processor time
for the whole run, Stillgate by what a sample more costs in a sweep on one thread, with drawing, judges and tally.
Without SimPy the script says so and ends with code 0; a difference ends with code 1.
"""

import argparse
import json
import pathlib
import random
import subprocess
import sys
import tempfile
import time

START = 100_000  # fs, when the rings are let go


class Network:
    """Gates by number, inputs first. Times in whole femtoseconds."""

    def __init__(self, rings, stop, seed):
        draw = random.Random(seed)
        self.names, self.kinds, self.pins, self.delays = ["go"], [None], [()], [None]
        before = 0
        for ring in range(rings):
            a = len(self.names)
            parts = [("a", "nand", (0, a + 2)), ("b", "not", (a,)), ("c", "not", (a + 1,)), ("x", "xor", (a + 2, before))]
            for part, kind, pins in parts:
                self.names.append(f"{part}{ring}")
                self.kinds.append(kind)
                self.pins.append(pins)
                # rise and fall
                self.delays.append((draw.randint(6_000_000, 14_000_000), draw.randint(5_000_000, 12_000_000)))
            before = a + 3
        self.stop = stop

    def toml(self):
        lines = ['title = "rings"', 'time_unit = "fs"', f'outputs = ["{self.names[-1]}"]', "[inputs]", "go = 0", "[gates]"]
        for name, kind, pins, delays in list(zip(self.names, self.kinds, self.pins, self.delays))[1:]:
            read = ", ".join(f'"{self.names[pin]}"' for pin in pins)
            # the order of `delays` is value 1, value 0
            lines.append(f"{name} = {{ {kind} = [{read}], rise = {delays[0]}, fall = {delays[1]} }}")
        lines += ["[limits]", "transitions = 1_000_000_000", "[[steps]]", f"at = {START}", "set = { go = 1 }"]
        lines += ["[[steps]]", f"at = {self.stop}", "set = { go = 0 }", "[sweep]", "search = 0"]
        return "\n".join(lines) + "\n"

    def rest(self):
        """The stable state with `go` at 0."""
        values = [0] * len(self.names)
        for net in range(1, len(values)):
            values[net] = self.value(net, values)
        return values

    def value(self, net, values):
        kind, pins = self.kinds[net], self.pins[net]
        if kind == "not":
            return 1 - values[pins[0]]
        if kind == "nand":
            # at rest with `go` at 0 the ring's last net is not known yet, and does not matter
            return 1 - (values[pins[0]] & values[pins[1]])
        return values[pins[0]] ^ values[pins[1]]


def simulate(simpy, network, keep):
    """Runs the network in SimPy. An event is a timeout with one callback; a cancelled one is left in the queue and ignored,
    which is the fastest way that the library offers. Returns the transitions (all of them if `keep`), and their number."""
    env = simpy.Environment()
    values = network.rest()
    readers = [[] for _ in values]
    for net, pins in enumerate(network.pins):
        for pin in set(pins):
            readers[pin].append(net)
    pending = [None] * len(values)
    waves = [[] for _ in values]
    value_of, delays = network.value, network.delays
    count = 0

    def change(net, new):
        nonlocal count
        count += 1
        values[net] = new
        if keep:
            waves[net].append((env.now, new))
        for reader in readers[net]:
            wanted = value_of(reader, values)
            if wanted == values[reader]:
                pending[reader] = None
            elif pending[reader] is None:
                event = env.timeout(delays[reader][0 if wanted else 1], value=(reader, wanted))
                pending[reader] = event
                event.callbacks.append(fire)

    def fire(event):
        net, new = event.value
        if pending[net] is event:
            pending[net] = None
            change(net, new)

    for at, new in ((START, 1), (network.stop, 0)):
        env.timeout(at, value=new).callbacks.append(lambda event: change(0, event.value))
    env.run()
    return waves, count, env.now


def stillgate(program, network, folder, *arguments):
    scenario = folder / "rings.toml"
    scenario.write_text(network.toml())
    command = [program, arguments[0], scenario, "--json", "--out", folder / "out", *arguments[1:]]
    began = time.perf_counter()
    done = subprocess.run([str(it) for it in command], capture_output=True, text=True)
    seconds = time.perf_counter() - began
    if done.returncode != 0:
        sys.exit(f"{' '.join(map(str, command))}: code {done.returncode}\n{done.stderr}")
    return json.loads(done.stdout), seconds


def agree(program, simpy, network, folder):
    """Every transition of every net, by both."""
    document, _ = stillgate(program, network, folder, "run")
    if document["waves_truncated"]:
        sys.exit("the run is too long to be compared transition by transition")
    waves, count, _ = simulate(simpy, network, keep=True)
    for name, wave, start in zip(network.names, waves, network.rest()):
        ours = [(int(at), value) for at, value in document["waves"][name]]
        if ours != [(0, start), *wave]:
            first = next((i for i, (a, b) in enumerate(zip(ours, [(0, start), *wave])) if a != b), "the end")
            sys.exit(f"net {name}: the transitions differ from number {first} on")
    if document["transitions"] != count:
        sys.exit(f"{document['transitions']} transitions in Stillgate, {count} in SimPy")
    return count


def main():
    options = argparse.ArgumentParser(description="Stillgate against SimPy on one network, checked and timed.")
    options.add_argument("--stillgate", default="target/release/stillgate", help="the program")
    options.add_argument("--rings", type=int, default=16, help="rings of four gates")
    options.add_argument("--length", type=int, default=10_000, help="nanoseconds")
    options.add_argument("--repeats", type=int, default=5, help="the fastest of so many counts")
    chosen = options.parse_args()
    try:
        import simpy
    except ImportError:
        print("SimPy is not installed for this Python; nothing was compared. `pip install simpy` in a virtual environment.")
        return
    if not pathlib.Path(chosen.stillgate).is_file():
        sys.exit(f"there is no {chosen.stillgate}: `cargo build --release`, or name the program with --stillgate")
    network = Network(chosen.rings, START + chosen.length * 1_000_000, seed=1)
    with tempfile.TemporaryDirectory() as name:
        folder = pathlib.Path(name)
        count = agree(chosen.stillgate, simpy, network, folder)
        print(f"{4 * chosen.rings} gates, {count:,} transitions: the same in both, every net, every time")

        slow = []
        for _ in range(chosen.repeats):
            began = time.process_time()
            simulate(simpy, network, keep=False)
            slow.append((time.process_time() - began) / count)

        # what samples more cost: starting, reading and writing are in both
        few, many = 2, max(12, 3_000_000 // count)
        def sweep(samples):
            arguments = ("sweep", "--samples", samples, "--threads", 1)
            return min(stillgate(chosen.stillgate, network, folder, *arguments)[1] for _ in range(chosen.repeats))
        fast = (sweep(many) - sweep(few)) / ((many - few) * count)
        if fast <= 0:
            sys.exit("too short to be timed: give a greater --length")
    print(f"SimPy {simpy.__version__}: {min(slow) * 1e9:,.0f} ns a transition, {1 / min(slow):,.0f} a second")
    print(f"Stillgate (a sweep on one thread, judges and tally): {fast * 1e9:,.1f} ns, {1 / fast:,.0f} a second")
    print(f"ratio: {min(slow) / fast:,.0f}")


if __name__ == "__main__":
    main()
