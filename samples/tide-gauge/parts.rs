//! The parts of the tide gauge: where they stand and which nets their pins join.

use super::design::Design;

/// Places all parts.
pub fn place(d: &mut Design) {
    front_end(d);
    converter(d);
    controller(d);
    field_bus(d);
    supply(d);
    for (k, (net, at)) in [
        ("+5V", (43.0, 22.4)),
        ("+3V3", (53.6, 32.6)),
        ("+3V3A", (27.0, 31.4)),
        ("GND", (29.4, 33.0)),
        ("REF_P", (14.0, 36.0)),
        ("AMP_OUT", (27.4, 62.6)),
        ("VIN_P", (68.0, 21.6)),
        ("RUN", (46.6, 45.6)),
    ]
    .into_iter()
    .enumerate()
    {
        d.place(&format!("TP{}", k + 1), "TEST", "test point", at, 0, net);
    }
}

/// Pressure bridge: clamp, excitation, filter, amplifier.
fn front_end(d: &mut Design) {
    d.place("J1", "CLAMP6", "pressure bridge", (6.5, 52.0), 0, "EXC_P SIG_P SIG_N EXC_N SHIELD GND");
    d.place("R1", "0603", "1k", (14.0, 59.5), 0, "SIG_P SIG_PF");
    d.place("R2", "0603", "1k", (14.0, 54.5), 0, "SIG_N SIG_NF");
    d.place("C1", "0603", "100nF", (17.0, 57.2), 1, "SIG_NF SIG_PF");
    d.place("C2", "0603", "10nF", (17.0, 61.0), 1, "SIG_PF GND");
    d.place("C3", "0603", "10nF", (17.0, 53.2), 3, "SIG_NF GND");
    d.place(
        "U1",
        "MSO8",
        "instrumentation amplifier",
        (21.5, 58.0),
        0,
        "RG_1 SIG_PF SIG_NF GND AMP_REF AMP_OUT +3V3A RG_2",
    );
    d.place("R3", "0603", "499R", (21.5, 61.6), 0, "RG_1 RG_2");
    d.place("C4", "0603", "100nF", (24.6, 60.7), 1, "+3V3A GND");
    d.place("R4", "0603", "100R", (27.0, 58.6), 0, "AMP_OUT AIN_P");
    d.place("R5", "0603", "10k", (16.6, 49.6), 1, "AMP_REF +3V3A");
    d.place("R6", "0603", "10k", (18.6, 49.6), 1, "GND AMP_REF");
    d.place("C6", "0603", "1uF", (20.6, 49.6), 1, "GND AMP_REF");
    d.place("R7", "0603", "100R", (21.6, 53.6), 0, "AMP_REF AIN_N");
    d.place("U4", "SOT23-5", "operational amplifier", (15.0, 67.0), 0, "EXC_S GND REF_P EXC_P +3V3A");
    d.place("R8", "0603", "10R", (14.0, 63.4), 0, "EXC_P EXC_S");
    d.place("C10", "0603", "100nF", (19.0, 67.4), 1, "GND +3V3A");
    d.place("R9", "0603", "0R", (14.0, 49.5), 0, "EXC_N GND");
    d.place("R10", "0603", "1M", (14.0, 44.5), 0, "SHIELD GND");
    d.place("C11", "0603", "1nF", (14.0, 41.8), 0, "SHIELD GND");
}

/// Converter, reference, temperature input, supply of the analog side.
fn converter(d: &mut Design) {
    d.place(
        "U2",
        "TSSO20",
        "24-bit converter",
        (30.0, 52.7),
        0,
        "AIN_P AIN_N AIN_T GND REF_P REF_N +3V3A GND CAP_P CAP_N \
         ADC_CLK ADC_RST ADC_START ADC_DRDY ADC_CS ADC_DOUT ADC_DIN ADC_SCK GND +3V3",
    );
    d.place("C5", "0603", "10nF", (24.6, 55.4), 1, "AIN_N AIN_P");
    d.place("C9", "0603", "10uF", (24.4, 51.6), 1, "REF_N REF_P");
    d.place("NT1", "TIE", "net tie", (24.4, 48.4), 1, "GND REF_N");
    d.place("C12", "0603", "100nF", (30.8, 47.4), 0, "+3V3A GND");
    d.place("C13", "0603", "100nF", (27.4, 47.6), 0, "CAP_P CAP_N");
    d.place("C14", "0603", "100nF", (34.4, 57.4), 0, "+3V3 GND");
    d.place("U3", "SOT23", "2.5 V reference", (21.0, 43.4), 0, "+3V3A GND REF_P");
    d.place("C7", "0603", "1uF", (24.4, 43.6), 1, "GND REF_P");
    d.place("C8", "0603", "100nF", (17.6, 43.6), 1, "GND +3V3A");
    d.place("R15", "0603", "1k", (21.4, 46.6), 0, "TEMP_IN AIN_T");
    d.place("R16", "0603", "10k", (17.8, 46.6), 2, "TEMP_IN REF_P");
    d.place("C15", "0603", "100nF", (26.8, 44.6), 1, "GND AIN_T");
    d.place("J6", "CLAMP2", "temperature probe", (22.0, 6.0), 1, "TEMP_IN GND");
    d.place("U9", "SOT23-5", "3.3 V regulator", (33.5, 24.0), 2, "+5V GND +5V LDO_NR +3V3A");
    d.place("C16", "0805", "4.7uF", (37.4, 24.0), 1, "+5V GND");
    d.place("C17", "0805", "4.7uF", (29.0, 23.4), 3, "+3V3A GND");
    d.place("C18", "0603", "10nF", (31.4, 27.0), 2, "LDO_NR GND");
}

/// Microcontroller with crystal, memory, clock chip, sockets.
fn controller(d: &mut Design) {
    d.place(
        "U5",
        "QFP48",
        "microcontroller",
        (62.05, 52.05),
        0,
        "+3V3 ADC_SCK ADC_DIN ADC_DOUT ADC_CS ADC_DRDY ADC_START ADC_RST ADC_CLK GND +3V3 PWR_GOOD \
         XTAL_1 XTAL_2 GND +3V3 RUN DBG_IO DBG_CK FLOAT_HI_F FLOAT_LO_F LED_RUN LED_BUS +3V3 \
         GND RTC_SCL RTC_SDA RTC_INT EXP0 EXP1 EXP2 EXP3 BUS_DE BUS_RX BUS_TX SYNC \
         +3V3 PULSE EXP4 EXP5 MEM_SCK MEM_SI MEM_SO MEM_CS MEM_WP GND - +3V3",
    );
    d.place("Y1", "CRYSTAL", "8 MHz", (58.4, 43.0), 0, "XTAL_1 GND XTAL_2 GND");
    d.place("C30", "0603", "12pF", (54.4, 42.15), 2, "XTAL_1 GND");
    d.place("C31", "0603", "12pF", (62.4, 43.85), 0, "XTAL_2 GND");
    d.place("C32", "0603", "100nF", (56.6, 57.6), 1, "+3V3 GND");
    d.place("C33", "0603", "100nF", (55.0, 48.0), 2, "+3V3 GND");
    d.place("C34", "0603", "100nF", (67.0, 46.4), 0, "+3V3 GND");
    d.place("C35", "0603", "100nF", (66.6, 57.3), 2, "+3V3 GND");
    d.place(
        "U6",
        "SO8-W",
        "16 Mbit flash",
        (60.0, 71.0),
        0,
        "MEM_CS MEM_SO MEM_WP GND MEM_SI MEM_SCK MEM_HOLD +3V3",
    );
    d.place("C36", "0603", "100nF", (66.8, 74.4), 0, "+3V3 GND");
    d.place("R20", "0603", "10k", (66.8, 72.0), 0, "MEM_HOLD +3V3");
    d.place("R19", "0603", "10k", (53.0, 68.0), 1, "MEM_CS +3V3");
    d.place("J4", "ROW6", "debug", (48.0, 75.6), 1, "+3V3 DBG_IO GND DBG_CK RUN -");
    d.place("R21", "0603", "10k", (50.4, 46.6), 0, "RUN +3V3");
    d.place("C37", "0603", "100nF", (50.4, 44.4), 0, "RUN GND");
    d.place("R32", "0603", "10k", (50.4, 38.4), 0, "PWR_GOOD +3V3");
    d.place("R30", "0603", "1k", (65.0, 39.2), 0, "LED_RUN LED_RUN_A");
    d.place("D6", "0603", "green", (68.8, 39.2), 0, "LED_RUN_A GND");
    d.place("R31", "0603", "1k", (65.0, 36.6), 0, "LED_BUS LED_BUS_A");
    d.place("D7", "0603", "yellow", (68.8, 36.6), 0, "LED_BUS_A GND");
    d.place("J5", "ROW8", "radio module", (76.0, 49.0), 0, "+3V3 EXP0 EXP1 EXP2 EXP3 EXP4 EXP5 GND");
    d.place(
        "U10",
        "SO8",
        "clock chip",
        (84.0, 48.0),
        0,
        "RTC_INT RTC_SDA RTC_SCL GND RTC_X2 RTC_X1 VBAT +3V3",
    );
    d.place("Y2", "CRYSTAL", "32.768 kHz", (90.2, 46.4), 1, "RTC_X2 GND RTC_X1 GND");
    d.place("C40", "POLY-D", "0.1 F", (91.4, 51.6), 0, "VBAT GND");
    d.place("C42", "0603", "100nF", (84.4, 51.8), 2, "+3V3 GND");
    d.place("J7", "ROW4", "pulse and sync", (88.0, 74.0), 1, "+3V3 GND PULSE SYNC");
    d.place("J8", "CLAMP3", "float switches", (94.0, 35.0), 0, "FLOAT_HI GND FLOAT_LO");
    d.place("R22", "0603", "10k", (86.6, 40.0), 2, "FLOAT_HI FLOAT_HI_F");
    d.place("C38", "0603", "100nF", (83.2, 38.6), 3, "FLOAT_HI_F GND");
    d.place("R24", "0603", "47k", (86.6, 42.2), 0, "FLOAT_HI_F +3V3");
    d.place("R23", "0603", "10k", (86.6, 30.0), 2, "FLOAT_LO FLOAT_LO_F");
    d.place("C39", "0603", "100nF", (83.2, 31.4), 1, "FLOAT_LO_F GND");
    d.place("R25", "0603", "47k", (86.6, 32.4), 0, "FLOAT_LO_F +3V3");
}

/// Field-bus transceiver and its protection.
fn field_bus(d: &mut Design) {
    d.place(
        "U7",
        "SO8",
        "field-bus transceiver",
        (84.0, 62.0),
        0,
        "BUS_RX BUS_DE BUS_DE BUS_TX GND BUS_A BUS_B +3V3",
    );
    d.place("C41", "0603", "100nF", (84.0, 66.6), 2, "+3V3 GND");
    d.place("R26", "0603", "10R", (88.4, 65.6), 1, "BUS_B LINE_B");
    d.place("R27", "0603", "10R", (88.4, 59.2), 3, "BUS_A LINE_A");
    d.place("D5", "SOT23", "bus protection", (86.4, 69.4), 0, "LINE_A LINE_B GND");
    d.place("J3", "CLAMP3", "field bus", (94.0, 62.0), 0, "LINE_B LINE_A GND");
    d.place("R28", "0603", "120R", (89.4, 68.6), 1, "LINE_A LINE_B");
}

/// Input protection, buck converter, digital regulator.
fn supply(d: &mut Design) {
    d.place("J2", "CLAMP2-FLAT", "12 V supply", (94.0, 15.0), 0, "VIN GND");
    d.place("F1", "1206", "500 mA", (86.0, 17.5), 2, "VIN VIN_F");
    d.place("D1", "SMA", "60 V 1 A", (79.0, 17.5), 2, "VIN_F VIN_P");
    d.place("D2", "SMB-TVS", "18 V", (84.2, 11.0), 1, "GND VIN_F");
    d.place("C20", "POLY-D", "22uF", (71.4, 13.0), 3, "VIN_P GND");
    d.place("C21", "1206", "10uF", (52.6, 10.3), 3, "VIN_P GND");
    d.place(
        "U8",
        "SO8",
        "buck converter",
        (58.0, 13.0),
        0,
        "BOOT SW_NODE VIN_P GND BUCK_FB BUCK_SS BUCK_EN PWR_GOOD",
    );
    d.place("D3", "SMA", "40 V 1 A", (48.8, 9.2), 3, "SW_NODE GND");
    d.place("L1", "COIL-6", "33uH", (47.0, 16.6), 2, "SW_NODE +5V");
    d.place("C24", "0603", "100nF", (53.2, 16.2), 2, "BOOT SW_NODE");
    d.place("C22", "1206", "22uF", (41.6, 16.4), 3, "+5V GND");
    d.place("C23", "1206", "22uF", (41.6, 10.4), 3, "+5V GND");
    d.place("R34", "0603", "52.3k", (59.6, 7.0), 0, "+5V BUCK_FB");
    d.place("R33", "0603", "10k", (64.2, 8.4), 0, "BUCK_FB GND");
    d.place("C27", "0603", "10nF", (64.2, 11.2), 0, "BUCK_SS GND");
    d.place("R35", "0603", "100k", (64.2, 13.6), 0, "BUCK_EN VIN_P");
    d.place("U11", "SOT23-5", "3.3 V regulator", (45.4, 31.0), 0, "+5V GND +5V - +3V3");
    d.place("C25", "0805", "4.7uF", (41.6, 31.0), 3, "+5V GND");
    d.place("C26", "0805", "4.7uF", (49.4, 31.0), 3, "+3V3 GND");
}
