"""Two-channel sweeps computed by ngspice: jig and part as a netlist, no arithmetic of ours."""

import subprocess
import tempfile
from pathlib import Path

import numpy as np

from .circuits import netlist

TEMPLATE = Path(__file__).with_name("two_channel_jig.cir")


def sweep(network, emf):
    """Frequencies in Hz and the complex channel voltages A and B. `network` None is the open jig."""
    part = ["* nothing in the jig"] if network is None else netlist(network, "dut", "low")
    with tempfile.TemporaryDirectory() as folder:
        data, circuit = Path(folder, "out.dat"), Path(folder, "jig.cir")
        text = TEMPLATE.read_text().format(emf=emf, part="\n".join(part), output=data)
        circuit.write_text(text)
        run = subprocess.run(["ngspice", "-b", str(circuit)], capture_output=True, text=True)
        if not data.exists():
            raise SystemExit(f"ngspice gave no result:\n{run.stdout}{run.stderr}")
        columns = np.loadtxt(data)
    return columns[:, 0], columns[:, 1] + 1j * columns[:, 2], columns[:, 3] + 1j * columns[:, 4]
