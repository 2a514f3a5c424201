"""What always stands on a sheet that someone builds from. No plan and no option takes it away."""

from partpick.cautions import LOCAL_RULES

ALWAYS = (
    LOCAL_RULES,
    "A few watts in a tank of high Q make hundreds of volts, more with the load off or the tank mistuned. Burns from "
    "radio frequency go deep: never touch or tune a live tank by hand; use insulated tools and shafts.",
    "Capacitors and supplies hold charge after switching off: unplug, discharge through a resistor, measure before "
    "touching. Never work alone on mains or high voltage.",
    "Under power every capacitor needs margin in voltage and in radio-frequency current. Class 2 ceramic and "
    "electrolytic capacitors are no tank capacitors: they heat, drift and can burst.",
    "Coils, formers and solder get hot in use; keep them off what burns. Radio frequency couples into other wiring: "
    "bond, bypass and shield.",
    "Transmitting needs a licence nearly everywhere, and an open oscillator radiates too: test into a shielded dummy "
    "load, keep to local exposure limits, and keep wearers of medical devices away.",
    "Wire under tension springs back: wear eye protection. Do not grind or break old ceramics and plated parts of "
    "unknown make; some are poisonous.",
)
