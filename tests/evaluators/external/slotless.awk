# A field solver of the simplest kind: fundamentals of a slotless machine with infinite iron and
# magnets of radial magnetisation and the permeability of air. Reads request.json line by line,
# writes reply.json.
#
# Magnets: with Phi = 0 on core and bore, Green's theorem with the solution g that is 0 on the core
# and 1 on the bore gives B(bore) = mu0 M / R * integral of r g' over the magnet.
# Currents: a sheet K at the bore makes B = mu0 K c, c = (R^2n + r^2n) / (R^2n - r^2n).
# Force: Maxwell stress at the bore of the pair of fields of orders p and ps = p + 1 or p - 1.

match($0, /^ *"[A-Za-z_0-9]+": -?[0-9][-+.eE0-9]*,?$/) {
    split($0, part, /": /)
    sub(/^ *"/, "", part[1])
    sub(/,$/, "", part[2])
    if (!(part[1] in given)) given[part[1]] = part[2] + 0
}

END {
    pi = atan2(0, -1)
    mu0 = 4e-7 * pi
    Q = given["slots"]; p = given["pole_pairs"]; ps = given["suspension_pole_pairs"]
    bore = given["bore_radius"]; magnet = given["magnet_radius"]; core = given["core_radius"]
    kw = given["torque_winding_factor"]; kws = given["suspension_winding_factor"]
    torque_current = given["torque_peak_A"]; force_current = given["suspension_peak_A"]

    spread = bore^p - core^(2 * p) * bore^(-p)
    inner = (magnet^(p + 1) - core^(p + 1)) / (p + 1)
    if (p == 1) inner += core^2 * log(magnet / core)
    else inner += core^(2 * p) * (core^(1 - p) - magnet^(1 - p)) / (p - 1)
    first = 4 / pi * sin(0.5 * pi * given["magnet_arc_ratio"]) * given["remanence_T"]
    B = first / bore * p / spread * inner

    linkage = kw * Q / 3 * 2 * bore * B / p
    per_ampere = 0.5 * bore * B * kws * Q / bore * (ratio(ps) + (ps - p))
    tooth = 2 * pi * bore / Q * B / given["tooth_width_m"]
    yoke = bore * B / p / (given["outer_radius"] - given["slot_radius"])
    loss = 30 * (given["electrical_frequency_Hz"] / 1000)^1.5

    printf "{\"format\": \"hovergap field reply\", \"format_version\": 1, \"status\": \"ok\",\n" > "reply.json"
    printf " \"field\": {\n" > "reply.json"
    put("torque_Nm_per_m", 1.5 * p * linkage * torque_current)
    put("torque_ripple", 0); put("cogging_Nm_per_m", 0)
    put("force_N_per_m", per_ampere * force_current)
    put("force_error_magnitude", 0); put("force_error_angle_deg", 0)
    put("force_per_ampere_turn_N_per_m_A", per_ampere)
    put("displacement_stiffness_N_per_m2", pi * bore * B^2 / (2 * mu0 * (bore - core)))
    put("flux_linkage_Wb_per_m", linkage)
    put("torque_inductance_H_per_m", inductance(kw, p))
    put("suspension_inductance_H_per_m", inductance(kws, ps))
    put("gap_flux_density_T", B); put("tooth_flux_density_T", tooth)
    put("yoke_flux_density_T", yoke)
    put("core_flux_density_T", bore * B / p / (core - given["shaft_radius"]))
    put("magnet_flux_density_T", 0.5 * B)
    put("loss_teeth_W_per_m", loss * tooth^2); put("loss_yoke_W_per_m", loss * yoke^2)
    put("loss_magnet_W_per_m", 0)
    printf "  \"loss_sleeve_W_per_m\": 0}}\n" > "reply.json"
}

function put(key, value) { printf "  \"%s\": %.17g,\n", key, value > "reply.json" }

function ratio(n) { return (bore^(2 * n) + core^(2 * n)) / (bore^(2 * n) - core^(2 * n)) }

# Flux of one phase's own field with current in all three, one turn a coil.
function inductance(k, n) {
    return k * Q / 3 * 2 * bore / n * mu0 * k * Q / (pi * bore) * ratio(n)
}
