#include "drawing/ink_grids.hpp"

namespace ringwright::samples {

const std::map<std::string, std::string>& ink_grids() {
    static const std::map<std::string, std::string> grids{
        {"decay-1",
         "aabfffeebbbbbbbbbbcdeecdefcceefa\n"
         "aaecaaaaaaaaaaaaaaaaaaaaaaaaaaba\n"
         "aadejebaaaaaaaaaaaaaaaaaaaaaaaba\n"
         "aacfjgejfcecbaaaaaaaaaaaaaaaaaca\n"
         "aacigfigfiggiihhffgfefeeeeeeedea\n"
         "aabjffjeefccbaaaaaaaaaaaaaaaaaba\n"
         "aadjdfcaaaaaaaaaaaaaaaaaaaaaaaca\n"
         "aadfbbbbbbbbbbbbbbbbbbbbbbbbbbca\n"
         "abdhjgigheeeeeeeeeeeeeeeedeeeeea\n"
         "abguvvtvuuuutuuutuuuutututuuuuua\n"
         "abeiiiiiiihijjiiihiiiiiijhiijhia\n"
         "aabaaaaaabaabaacedbaabaabaabaaaa\n"},
        {"spectrum-1",
         "abeedfbaaaaaaaaaaaaaaaaaaadefdea\n"
         "acddcdcbbbbbbbbcbbbbbbbbbbbcccda\n"
         "acaaaaaaaaaaaaedcaaaaaaaaaaaaaba\n"
         "bdaaaaaaaaaaaccaeaaaaaaaaaaaaaca\n"
         "acbbbbbbbbbbbjffggbbbbbbbbbbbbda\n"
         "bdaaaaaaaaaaeegggecaaaaaaaaaaaca\n"
         "bcaaaaaaaabebegggbdcaaaaaaaaaaca\n"
         "acaaaaaaddcaaegggbacdbaaaaaaaaba\n"
         "bdddddddbaaaaegggbaaacddddbaaaca\n"
         "abaaaaaaaaaaaegggbaaaaaaaacdddea\n"
         "bcbdcbbbebbbbecccbdbbbcdbbbcdbba\n"
         "aaaaaaaaaaaaaaegfecaaaaaaaaaaaaa\n"},
        {"methods",
         "aaaaaaaaabbbbbccbbbbbbbbbbcccbca\n"
         "dgdffeffdbaaaahjhebcbaaabeimheba\n"
         "aabfheffceeeeghlfbacceeeegjmifca\n"
         "cfdggddeccaaceknhbaccaaceennjcca\n"
         "bcchgfggdbaeeejjeeccbaaaeejhdaba\n"
         "aabeeaaaabaaaafmfbacbaaaaelkfaba\n"
         "dgdffeffdcaaeekjcaaccaaaceimhdca\n"
         "aabefeffcbaceehleeedbdeeegijheea\n"
         "abbefaaaacaaaaineaaccaaaadjnhaca\n"
         "fjfhhbaaacccbbgmdbcdcbdcbdilhcca\n"
         "aaaaaaaaaabggfhgfbbcaadbgjgddbaa\n"
         "aaaaaaaaaaabbbbbaaaaaaaabbbaaaaa\n"},
        {"verdict",
         "aabfebaaaaaaaaaaaaaaaeedaaaaaaaa\n"
         "acbcqkiiiiiioroiiiiiimlbbdghfaaa\n"
         "abbbgeeeheeeeeeeheeeeffcdbaaaaaa\n"
         "aaaaaaaaaaadfffaaaaaaaaaaaaaaaaa\n"
         "abcglgeeeeeeeeeeeeeeilgbbbaaaaaa\n"
         "acbcpkiiiiiiiiiiiiilqugbbdiiiaaa\n"
         "acdaadbabdaehgeceaaccaaebaaaaaaa\n"
         "aaaaaaaaaaaaaaaaaaaaadedaaaaaaaa\n"
         "acbbhggkgggbbbbbbbbbbbmoodgffggb\n"
         "aebbbecbbddbbcdbbcebbbheebaaaaaa\n"
         "aaaaaaaaaaefffeebaaaaaaaaaaaaaaa\n"
         "aaaaaaaaaaaaaaadefeeebcfeecceefa\n"},
    };
    return grids;
}

}  // namespace ringwright::samples
