Limiter ahead of the converter
* The amplifier shares the 5 V supply with the converter and saturates before the converter can be overdriven.
* Storm signals reach 1.2 V either side of mid scale; in calm weather it is a few tens of millivolts.
V5   VDD 0 5
VSIG SEA MID SIN(0 1.2 40)

* mid scale
R1 VDD  MIDX 10k
R2 MIDX 0    10k
C1 MIDX 0    10u
U3 CONV SUM MID 0 MIDX MID MID VDD TLV9062

* gain -4.7
R3 SEA SUM  10k
R4 SUM CONV 47k
C2 SUM CONV 1n

R5 CONV ADCIN 220
C3 ADCIN 0    10n

C4 VDD 0 100n
C5 VDD 0 4.7u
.tran 100u 200m
.end
