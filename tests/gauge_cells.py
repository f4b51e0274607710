"""Cells of a gauge board as text, for tests of the core: supplies, a 3.3 V controller, 5 V parts, shifters."""

SUPPLIES = """
J9 USB Connector:USB_B_Micro | 1 VBUS power_out +5V | 5 GND power_in GND
U9 AMS1117-3.3 Regulator_Linear:AMS1117-3.3 | 1 GND power_in GND | 2 VO power_out +3V3 | 3 VI power_in +5V
C1 10u Device:C | 1 - passive +3V3 | 2 - passive GND
C2 10u Device:C | 1 - passive +5V | 2 - passive GND
"""
# PA0 and PA3 are not 5 V tolerant; PA9 and PA10 are (ST STM32F030 pin table: TTa against FTf).
CONTROLLER = (
    "U1 STM32F030F4Px MCU_ST_STM32F0:STM32F030F4Px | 16 VDD power_in +3V3 | 15 VSS power_in GND"
    " | 6 PA0 bidirectional /A | 9 PA3 bidirectional /B | 17 PA9 bidirectional /SCL | 18 PA10 bidirectional /SDA\n"
)
INVERTER_5V = "U2 74HC14 74xx:74HC14 | 14 VCC power_in +5V | 7 GND power_in GND | 1 - input GND | 2 - output {out}\n"
CLOCK_5V = (
    "U3 DS1307Z+ Timer_RTC:DS1307Z+ | 8 VCC power_in +5V | 4 GND power_in GND"
    " | 5 SDA bidirectional /SDA5 | 6 SCL input /SCL5\n"
)
PULL_UPS = (
    "R5 10k Device:R | 1 - passive +3V3 | 2 - passive /SDA\nR6 10k Device:R | 1 - passive +5V | 2 - passive /SDA5\n"
    "R7 10k Device:R | 1 - passive +3V3 | 2 - passive /SCL\nR8 10k Device:R | 1 - passive +5V | 2 - passive /SCL5\n"
)
MOSFET_PAIR = (
    "Q1 BSS138 Transistor_FET:BSS138 | 1 G passive +3V3 | 2 S passive /SDA | 3 D passive /SDA5\n"
    "Q2 BSS138 Transistor_FET:BSS138 | 1 G passive +3V3 | 2 S passive /SCL | 3 D passive /SCL5\n"
)
BIPOLAR_CELL = (
    "Q1 MMBT3904 Transistor_BJT:MMBT3904 | 1 B input /B1 | 2 E passive /SDA | 3 C passive /SDA5\n"
    "R9 1k Device:R | 1 - passive {base} | 2 - passive /B1\n"
)


def resistor(reference: str, value: str, a: str, b: str) -> str:
    """Return one resistor."""
    return f"{reference} {value} Device:R | 1 - passive {a} | 2 - passive {b}\n"


BUS = SUPPLIES + CONTROLLER + CLOCK_5V
