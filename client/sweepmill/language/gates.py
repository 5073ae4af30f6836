"""Names of gates: random ones, definite Cliffords, and the synonyms people write."""

from sweepmill.language.refusal import near, shown

UNIFORM = "uniform-clifford"
RANDOM_GATES: dict[str, tuple[int, ...]] = {
    UNIFORM: (1, 2),
    "identity-class": (2,),
    "cnot-class": (2,),
    "iswap-class": (2,),
    "swap-class": (2,),
}
"""Random gates with the numbers of sites they act on; those of a class are uniform in it."""

ONE_SITE = (
    *("id", "x", "y", "z", "h", "s", "sdg", "sx", "sxdg", "sy", "sydg"),
    *("h_xy", "h_yz", "h_nxy", "h_nxz", "h_nyz"),
    *("c_xyz", "c_zyx", "c_nxyz", "c_xnyz", "c_xynz", "c_nzyx", "c_znyx", "c_zynx"),
)
TWO_SITES = (
    *("cx", "cy", "cz", "swap", "iswap", "iswap_dg"),
    *("sqrt_xx", "sqrt_xx_dg", "sqrt_yy", "sqrt_yy_dg", "sqrt_zz", "sqrt_zz_dg"),
    *("xcx", "xcy", "xcz", "ycx", "ycy", "ycz", "cxswap", "swapcx", "czswap"),
)
GATES: dict[str, tuple[int, ...]] = RANDOM_GATES | dict.fromkeys(ONE_SITE, (1,)) | dict.fromkeys(TWO_SITES, (2,))
"""Every canonical name with the numbers of sites it acts on. Definite gates act as stim defines them."""

SYNONYMS = {
    "i": "id",
    "h_xz": "h",
    "sz": "s",
    "szdg": "sdg",
    "sqrt_x": "sx",
    "sqrt_y": "sy",
    "sqrt_z": "s",
    "sqrt_x_dg": "sxdg",
    "sqrt_y_dg": "sydg",
    "sqrt_z_dg": "sdg",
    "s_dg": "sdg",
    "sx_dg": "sxdg",
    "sy_dg": "sydg",
    "cnot": "cx",
    "zcx": "cx",
    "zcy": "cy",
    "zcz": "cz",
    "swapcz": "czswap",
    "dcx": "swapcx",
}
"""Names of stim (in lower case, ``_dag`` written ``_dg``) and OpenQASM that mean a gate with another name here."""


def canonical_gate(name: object) -> str:
    """The one name of a gate. Raises ValueError saying what would pass."""
    if not isinstance(name, str):
        raise ValueError(f"a gate is named by a text, got {shown(name)}")
    plain = name.strip().lower()
    if plain.replace("_", "-") in RANDOM_GATES:
        return plain.replace("_", "-")
    plain = plain.removesuffix("_dag") + "_dg" if plain.endswith("_dag") else plain
    plain = SYNONYMS.get(plain, plain)
    if plain not in GATES:
        known = {**GATES, **SYNONYMS}
        raise ValueError(f"unknown gate {shown(name)}{near(plain, known)} (gates: {', '.join(GATES)})")
    return plain
