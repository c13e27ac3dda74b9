mask() { sed -E 's/[0-9]+ starts, [0-9]+ conv/# starts, # conv/; s/balanced to [0-9]+([.][0-9]+)?(e-?[0-9]+)?/balanced to #/'; }
try steady --quiet networks/double-phosphorylation.mech | mask
try steady --quiet networks/schloegl-2.mech | mask
try steady --quiet networks/brusselator.mech --set '[B]=1.7' | mask
try steady --quiet networks/gray-scott.mech --along residence | mask
try steady --quiet networks/schloegl-2.mech --along '[B]' --sensitivities | mask
try steady --quiet networks/schloegl-2.mech --along '[C]'
try steady --quiet networks/schloegl-2.mech --along '[A]'
