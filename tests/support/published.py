"""Six limiters on one board, each built to a published design rule; an invented board with invented parts.

1  sink: R = 0.6 V / I and a forced gain of ten (two-transistor current sink)
2  source: the same with PNP devices, in the lead to the supply
3  LED sink with a MOSFET: 1.8 ohm for 320 mA, the resistor rated twice its power
4  foldback: 10 V out, about 1.3 A at the knee and 0.8 A into a short (divider from the sense resistor to ground)
5  series regulator's pass stage: limit at 1.2 to 1.5 times the load, op-amp drive with a series resistor
6  current source of 20 mA: 0.6 V / 30 ohm
"""

from __future__ import annotations

from tests.support.desk import limits, part_data
from tests.support.judged import FIXED, Job

BOARD = """
J1 CONN - CMD1 LAMP1
R11 RES 180 CMD1 B1 POWER:0.25W
Q11 NPN QPN1 LAMP1 B1 S1
R12 RES 2.7 S1 GND POWER:0.5W
R13 RES 100 S1 T1 POWER:0.125W
Q12 NPN QSN1 B1 T1 GND
C11 CAP 22n B1 T1

J2 CONN - PULL2 OUT2
R21 RES 470 PULL2 B2 POWER:1W VOLTAGE:200V
Q21 PNP QPP1 OUT2 B2 S2
R22 RES 2.7 +12V S2 POWER:0.5W
R23 RES 150 S2 T2 POWER:0.125W
Q22 PNP QSP1 B2 T2 +12V
C21 CAP 22n B2 T2

J3 CONN - CMD3 LED3
R31 RES 10k CMD3 G3 POWER:0.125W
Q31 NMOS MPN1 LED3 G3 S3
R32 RES 1.8 S3 GND POWER:0.5W
R33 RES 680 S3 T3 POWER:0.125W
Q32 NPN QSN1 G3 T3 GND
C31 CAP 22n G3 T3

J4 CONN - OUT4 DRV4
R41 RES 390 DRV4 B4 POWER:2W VOLTAGE:200V
Q41 NPN QPN1 +20V B4 S4
R42 RES 1 S4 OUT4 POWER:5W
R43 RES 180 S4 T4 POWER:0.25W
R44 RES 1k8 T4 GND POWER:0.5W
Q42 NPN QSN1 B4 T4 OUT4
C41 CAP 22n B4 T4

J5 CONN - OUT5 -
U51 OPAMP OPX1 OUT=DRV5 V+=+24V V-=GND
R51 RES 680 DRV5 B5 POWER:1W VOLTAGE:200V
Q51 NPN QPN1 +24V B5 S5
R52 RES 1.2 S5 OUT5 POWER:2W
R53 RES 150 S5 T5 POWER:0.125W
Q52 NPN QSN1 B5 T5 OUT5
C51 CAP 22n B5 T5

J6 CONN - LED6 +5V
R61 RES 2k2 B6 GND POWER:0.125W
Q61 PNP QPP1 LED6 B6 S6
R62 RES 30 +5V S6 POWER:0.125W
R63 RES 100 S6 T6 POWER:0.125W
Q62 PNP QSP1 B6 T6 +5V
C61 CAP 22n B6 T6

J7 CONN - +12V GND
J8 CONN - +20V +24V
"""

NEEDS = {
    "Q11": {"carry": "0.15 A", "cap": "0.4 A", "output": "2 V", "shorted_to": ["+12V"], "sink": "8 K/W"},
    "Q21": {"carry": "0.15 A", "cap": "0.4 A", "output": "10 V", "sink": "8 K/W", "load_capacitance": "1 uF"},
    "Q31": {"carry": "0.25 A", "cap": "0.45 A", "output": "3 V", "shorted_to": ["+12V"], "sink": "6 K/W"},
    "Q41": {
        "carry": "0.8 A", "cap": "2.2 A", "output": "10 V", "sink": "0.5 K/W", "load": "12 ohm", "load_capacitance": "10 uF",
    },
    "Q51": {"carry": "0.4 A", "cap": "0.8 A", "output": "12 V", "sink": "1.5 K/W", "load_capacitance": "10 uF"},
    "Q61": {"carry": "15 mA", "cap": "35 mA", "output": "3 V", "load_capacitance": "1 uF", "regulate": "20 mA"},
}  # fmt: skip


def six_limiters() -> Job:
    """Return the board with everything stated that its designer knows."""
    drive = {
        "CMD1": {"low": "0 V", "high": "5 V"},
        "PULL2": {"low": "0 V", "high": "12 V"},
        "CMD3": {"low": "0 V", "high": "10 V"},
        "DRV4": {"low": "0 V", "high": "20 V", "current": "60 mA"},
    }
    drivers = {"OPX1": {"from_rails": "1.5 V", "current": "40 mA", "power": "1 W"}}
    supply = {**FIXED, "+5V": "5 V 5 %"}
    return Job(BOARD, limits(supply=supply, drive=drive, driver=drivers, limiter=NEEDS), part_data())
